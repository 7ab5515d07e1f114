"""The frame of the page: its HTML and its look. User text enters through the escaping template only."""

from __future__ import annotations

__all__ = ["HEAD", "STYLE", "TEMPLATE"]

STYLE = """
:root { --ink: #1d2730; --quiet: #525d66; --rule: #cfd5d9; --soil: #6b4f2a; --pale: #f5f1ea; --ice: #e9f3fa; }
* { box-sizing: border-box; }
body { margin: 0; color: var(--ink); background: #fff; font: 15px/1.5 Arial, "Liberation Sans", Helvetica, sans-serif; }
main { width: 100%; max-width: 996px; margin: 0 auto; padding: 0 16px 48px; }
header { border-bottom: 6px solid var(--soil); padding: 24px 0 12px; margin-bottom: 18px; }
.layers tbody { break-inside: avoid; }
.layers th { overflow-wrap: normal; }
.layers th:first-child { width: 16%; }
.layers .numbers td:not(:first-child) { overflow-wrap: normal; white-space: nowrap; }
.layers .numbers td { border-bottom: 0; padding-bottom: 0; }
.layers .source td { color: var(--quiet); padding-top: 0; }
.trust td:first-child { width: 32%; }
.every th { overflow-wrap: normal; }
.every td { white-space: nowrap; padding-top: 4px; padding-bottom: 4px; }
.every .deepest td { font-weight: bold; background: var(--ice); }
#design dd:not(:first-of-type) { font-weight: normal; }
.note { margin: 6px 0 0; font-size: 14px; color: var(--quiet); }
.trust td:nth-child(2) { width: 26%; }
h1 { font-size: 26px; line-height: 1.25; margin: 0 0 4px; overflow-wrap: anywhere; }
h2 { font-size: 19px; margin: 34px 0 10px; }
h3 { font-size: 15px; margin: 20px 0 8px; }
#inputs dd { font-weight: normal; }
header p { margin: 0; color: var(--quiet); }
.caution { background: var(--pale); border-left: 6px solid var(--soil); padding: 10px 14px; margin: 0 0 18px; }
dl { display: grid; grid-template-columns: 270px 1fr; margin: 0; border-top: 1px solid var(--rule); }
dt, dd { margin: 0; padding: 8px 10px; border-bottom: 1px solid var(--rule); }
dt { color: var(--quiet); padding-left: 0; }
dd { font-weight: bold; overflow-wrap: anywhere; }
.scroll { overflow-x: auto; }
table { border-collapse: collapse; width: 100%; margin: 6px 0 0; font-size: 14px; }
caption { text-align: left; color: var(--quiet); padding: 14px 0 4px; }
th, td { text-align: left; padding: 6px 10px 6px 0; border-bottom: 1px solid var(--rule); vertical-align: top;
  overflow-wrap: anywhere; font-variant-numeric: tabular-nums; }
th { color: var(--quiet); font-weight: normal; border-bottom: 2px solid var(--soil); }
figure { margin: 0 0 30px; }
figcaption { font-size: 14px; color: var(--quiet); padding: 8px 0 0 66px; }
pre { font-size: 12.5px; line-height: 1.4; background: var(--pale); padding: 12px;
  white-space: pre-wrap; overflow-wrap: anywhere; }
summary { cursor: pointer; }
@media (min-width: 1560px) {
  main { max-width: 1540px; display: grid; grid-template-columns: 560px 900px; column-gap: 48px; align-items: start; }
  header, .wide { grid-column: 1 / -1; }
  .words { grid-column: 1; grid-row: 3; }
  .pictures { grid-column: 2; grid-row: 3; }
  dl { grid-template-columns: 190px 1fr; }
}
@media print {
  @page { margin: 14mm 12mm; }
  body { font-size: 10.5pt; }
  main { display: block; max-width: none; padding: 0; }
  header { padding-top: 0; }
  h3 { break-after: avoid; }
  h2 { break-after: avoid; margin-top: 20px; }
  figure, tr, dl > *, .caution, li { break-inside: avoid; }
  figure { margin-bottom: 14px; }
  .picture { zoom: 0.77; }
  figcaption { padding-left: 48px; font-size: 9.5pt; }
  table, li { font-size: 9.5pt; }
  th, td, dt, dd { padding-top: 3px; padding-bottom: 3px; }
  .note { font-size: 9.5pt; }
  .every td { padding-top: 2px; padding-bottom: 2px; }
  details:not([open]) { display: none; }
}
"""

HEAD = """<!DOCTYPE html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta name="viewport" content="width=device-width, initial-scale=1">
<title>{{ title }}</title>
{{ bokeh_css | safe }}
<style>{{ style | safe }}
.picture { width: {{ picture_width }}px; }</style>
<script>
// pictures are drawn with two pixels or more for each of the screen's, so that they print sharp
Object.defineProperty(window, "devicePixelRatio", { value: Math.max(2, window.devicePixelRatio) });
</script>
</head>
<body>
<main>
"""
"""How every page begins: it asks for `title`, `bokeh_css`, `style` and `picture_width`."""

TEMPLATE = (
    HEAD
    + """<header>
<h1>{{ title }}</h1>
<p>Ground temperature and frost depth, {{ period }}</p>
</header>
<p class="caution wide"><strong>{{ short_caution }}</strong></p>
<div class="words">
<section>
<h2>Answers</h2>
<dl>
{% for answer in answers %}
<dt>{{ answer.question }}</dt><dd data-answer="{{ answer.key }}">{{ answer.text }}</dd>
{% endfor %}
</dl>
{% if winters %}
<div class="scroll"><table>
<caption>Frost by winter, named by the year in which the winter ends</caption>
<thead><tr><th>winter</th><th>greatest frost depth</th><th>on</th><th>first frost</th><th>last frost</th></tr></thead>
<tbody>
{% for row in winters %}
<tr>{% for cell in row %}<td>{{ cell }}</td>{% endfor %}</tr>
{% endfor %}
</tbody></table></div>
{% endif %}
<div class="scroll"><table>
<caption>Temperature by depth, of the output times</caption>
<thead><tr><th>depth</th><th>coldest</th><th>mean</th><th>warmest</th><th>numerical error</th></tr></thead>
<tbody>
{% for row in depths %}
<tr>{% for cell in row %}<td>{{ cell }}</td>{% endfor %}</tr>
{% endfor %}
</tbody></table></div>
</section>
</div>
<section class="pictures">
<h2>Pictures</h2>
{% for root in roots %}
<figure>
<div class="picture"><div id="{{ root.elementid }}" data-root-id="{{ root.id }}" style="display: contents;"></div></div>
<figcaption>{{ captions[root.name] }}</figcaption>
</figure>
{% endfor %}
{% if is_one_depth %}
<p>The result holds one depth only: there is no map through time and depth.</p>
{% endif %}
</section>
{% if every_winter or design %}
<section class="wide" id="winters">
<h2>Winters</h2>
{% if design %}
<h3>Design</h3>
<dl id="design">
{% for name, text in design %}
<dt>{{ name }}</dt><dd>{{ text }}</dd>
{% endfor %}
</dl>
{% endif %}
{% if returned %}
<h3>Rare frost</h3>
<div class="scroll"><table id="returned">
<caption>Frost that is exceeded on average once in so many winters, with the interval that holds 90 %</caption>
<thead><tr>{% for cell in returned[0] %}<th>{{ cell }}</th>{% endfor %}</tr></thead>
<tbody>
{% for row in returned[1:] %}
<tr>{% for cell in row %}<td>{{ cell }}</td>{% endfor %}</tr>
{% endfor %}
</tbody></table></div>
<p class="note">Fitted to the greatest frost of each winter. The intervals hold the shortness of the record, not a
climate that changes, nor what is uncertain in the ground and its surface.</p>
{% endif %}
{% if every_winter %}
<h3>Every winter</h3>
<div class="scroll"><table class="every" id="every-winter">
<thead><tr>{% for cell in every_winter[0] %}<th>{{ cell }}</th>{% endfor %}</tr></thead>
<tbody>
{% for row in every_winter[1:] %}
<tr{% if loop.index0 == deepest_winter %} class="deepest"{% endif %}>
{% for cell in row %}<td>{{ cell }}</td>{% endfor %}
</tr>
{% endfor %}
</tbody></table></div>
{% for note in winter_notes %}
<p class="note">{{ note }}</p>
{% endfor %}
{% endif %}
</section>
{% endif %}
{% if materials or facts or layers %}
<section class="wide" id="inputs">
<h2>What it stands on</h2>
{% if materials %}
<div class="scroll"><table class="layers">
<caption>Layers of the ground, as solved</caption>
<thead><tr>{% for name in material_heads %}<th>{{ name }}</th>{% endfor %}</tr></thead>
{% for row in materials %}
<tbody>
<tr class="numbers">{% for cell in row.cells %}<td>{{ cell }}</td>{% endfor %}</tr>
<tr class="source"><td colspan="{{ material_heads | length }}">{{ row.source }}</td></tr>
</tbody>
{% endfor %}
</table></div>
{% endif %}
{% if layers %}
<div class="scroll"><table>
<caption>Layers as drawn in the pictures</caption>
<thead><tr><th>layer</th><th>from</th><th>to</th><th>thickness</th></tr></thead>
<tbody>
{% for row in layers %}
<tr>{% for cell in row %}<td>{{ cell }}</td>{% endfor %}</tr>
{% endfor %}
</tbody></table></div>
{% endif %}
{% if facts %}
<h3>Surface, record and run</h3>
<dl>
{% for name, text in facts %}
<dt>{{ name }}</dt><dd>{{ text }}</dd>
{% endfor %}
</dl>
{% endif %}
{% if quality_report %}
<h3>Quality report of the record</h3>
<pre>{{ quality_report }}</pre>
{% endif %}
</section>
{% endif %}
<section class="wide">
<h2>How far to trust these numbers</h2>
<p>The figures below tell how well the equations were solved, and how simpler formulas compare. How well the layers, the
weather and the surface are known is another matter and mostly the larger doubt: see the cautions.</p>
<div class="scroll"><table class="trust">
<thead><tr><th>what</th><th>how much</th><th>meaning</th></tr></thead>
<tbody>
{% for row in trust %}
<tr>{% for cell in row %}<td>{{ cell }}</td>{% endfor %}</tr>
{% endfor %}
</tbody></table></div>
{% if closed_forms %}
<details><summary>The annual wave by depth, and the closed forms beside it</summary>
<pre>{{ closed_forms }}</pre></details>
{% endif %}
</section>
<section class="wide">
<h2>Cautions</h2>
<ul>
{% for caution in cautions %}
<li>{{ caution }}</li>
{% endfor %}
</ul>
</section>
{% if site_file %}
<section class="wide">
<details><summary>The site file that this result was made from</summary><pre>{{ site_file }}</pre></details>
</section>
{% endif %}
</main>
{{ bokeh_js | safe }}
{{ plot_script | safe }}
</body>
</html>
"""
)
