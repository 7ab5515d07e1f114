"""The frame of the page of a studied climate: its HTML, and what its look adds to that of the page of a result."""

from __future__ import annotations

from soiltemp.figures.page_text import HEAD

__all__ = ["CLIMATE_STYLE", "CLIMATE_TEMPLATE"]

CLIMATE_STYLE = """
.designs td:nth-child(1), .designs th:nth-child(1) { width: 44%; }
.designs td:nth-child(2), .returned td, .winters td { white-space: nowrap; overflow-wrap: normal; }
.designs td:nth-child(2), .designs th:nth-child(2) { text-align: right; padding-right: 18px; font-weight: bold; }
.winters { font-size: 13px; }
.winters th, .winters td { text-align: right; padding-top: 3px; padding-bottom: 3px; }
.winters th:first-child, .winters td:first-child, .winters th:last-child, .winters td:last-child { text-align: left; }
.winters tr:first-child th, .returned tr:first-child th { border-bottom: 0; padding-bottom: 0; }
.winters td:last-child { padding-left: 12px; }
.winters tr.cold td { background: var(--ice); font-weight: bold; }
.winters tr.cut td { color: var(--quiet); font-style: italic; }
.notes li { margin-bottom: 4px; }
.sources dt, .sources dd, .report li { font-size: 14px; }
.sources dd { font-weight: normal; }
code { font-size: 13px; background: var(--pale); padding: 2px 6px; overflow-wrap: anywhere; }
@media (min-width: 1560px) { .words { grid-row: auto; } .pictures { grid-row: 3; } }
@media print {
  thead { display: table-header-group; }
  .every { break-before: page; }
  .sources { display: block; }
  .sources dt { border-bottom: 0; break-after: avoid; font-weight: bold; padding: 4px 0 0; }
  .sources dd { padding: 0 0 4px; }
  .winters { font-size: 8.5pt; }
  .winters th, .winters td { padding-top: 1px; padding-bottom: 1px; }
}
"""

CLIMATE_TEMPLATE = (
    HEAD
    + """<header>
<h1>Winters of {{ source }}</h1>
<p>Freezing indices, design values and climate of the record, {{ period }}</p>
</header>
<p class="caution wide"><strong>{{ short_caution }}</strong>
{% if warming %}
<br>{{ warming }}
{% endif %}
</p>
<section class="words">
<h2>Design freezing index of the air, by the {{ definition }}</h2>
<p>{{ winters_sentence }}</p>
<div class="scroll"><table class="designs">
<thead><tr>{% for cell in design_head %}<th>{{ cell }}</th>{% endfor %}</tr></thead>
<tbody>
{% for row in designs %}
<tr>{% for cell in row %}<td>{{ cell }}</td>{% endfor %}</tr>
{% endfor %}
</tbody></table></div>
<ul class="notes">
{% for note in design_notes %}
<li>{{ note }}</li>
{% endfor %}
</ul>
<h3>By return period, with intervals that hold {{ confidence }}</h3>
<div class="scroll"><table class="returned">
<thead>
{% for head in returned_heads %}
<tr>{% for cell in head %}<th>{{ cell }}</th>{% endfor %}</tr>
{% endfor %}
</thead>
<tbody>
{% for row in returned %}
<tr>{% for cell in row %}<td>{{ cell }}</td>{% endfor %}</tr>
{% endfor %}
</tbody></table></div>
<ul class="notes">
{% for sentence in return_sentences %}
<li>{{ sentence }}</li>
{% endfor %}
</ul>
{% if notes %}
<h2>Notes</h2>
<ul class="notes" id="notes">
{% for note in notes %}
<li>{{ note }}</li>
{% endfor %}
</ul>
{% endif %}
<h2>Trend and climate</h2>
<ul class="notes">
{% for sentence in trends %}
<li>{{ sentence }}</li>
{% endfor %}
</ul>
<h3>Periodic climate fitted to the record</h3>
<dl id="inputs">
{% for name, text in wave %}
<dt>{{ name }}</dt><dd>{{ text }}</dd>
{% endfor %}
</dl>
{% if site_file_line %}
<p>In a site file: <code>{{ site_file_line }}</code><br>It is an average year: half of the winters are colder.</p>
{% endif %}
</section>
<section class="pictures">
<h2>Pictures</h2>
{% for root in roots %}
<figure>
<div class="picture"><div id="{{ root.elementid }}" data-root-id="{{ root.id }}" style="display: contents;"></div></div>
<figcaption>{{ captions[root.name] }}</figcaption>
</figure>
{% endfor %}
</section>
<section class="wide every">
<h2>Every winter</h2>
<div class="scroll"><table class="winters">
<thead>
{% for head in winter_heads %}
<tr>{% for cell in head %}<th>{{ cell }}</th>{% endfor %}</tr>
{% endfor %}
</thead>
<tbody>
{% for mark, row in winters %}
<tr class="{{ mark }}">{% for cell in row %}<td>{{ cell }}</td>{% endfor %}</tr>
{% endfor %}
</tbody></table></div>
<p>{{ table_note }}</p>
</section>
<section class="wide">
<h2>Sources of the practices</h2>
<dl class="sources">
{% for title, source in sources.items() %}
<dt>{{ title }}</dt><dd>{{ source }}</dd>
{% endfor %}
</dl>
<h2>What it stands on</h2>
<dl class="sources">
{% for name, text in facts %}
<dt>{{ name }}</dt><dd>{{ text }}</dd>
{% endfor %}
</dl>
<h3>Quality report of the record</h3>
<ul class="notes report">
{% for line in quality_report %}
<li>{{ line }}</li>
{% endfor %}
</ul>
</section>
<section class="wide">
<h2>Cautions</h2>
<ul>
{% for caution in cautions %}
<li>{{ caution }}</li>
{% endfor %}
</ul>
</section>
</main>
{{ bokeh_js | safe }}
{{ plot_script | safe }}
</body>
</html>
"""
)
