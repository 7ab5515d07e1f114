"""The checkers of CF files, without a network: compliance-checker (CF 1.11, ACDD 1.3) and cfchecks (CF up to 1.8)."""

from __future__ import annotations

import json
import shutil
from pathlib import Path

import netCDF4

AREA_TYPES = """<?xml version="1.0"?>
<area_type_table><version_number>1</version_number><date>2020-01-01</date><entry id="land"/></area_type_table>
"""
REGIONS = """<?xml version="1.0"?>
<standardized_region_list><version_number>1</version_number><date>2020-01-01</date><entry id="global"/>
</standardized_region_list>
"""


def compliance_messages(path: Path, checker: str, folder: Path) -> list[str]:
    """What compliance-checker says, as "priority: check: message".

    Its JSON repeats, among the low priorities, a check that passes ("... crosses 1582"): results with full marks are
    left out.
    """
    from compliance_checker.runner import CheckSuite, ComplianceChecker

    CheckSuite.load_all_available_checkers()
    report = folder / "compliance.json"
    ComplianceChecker.run_checker(
        str(path), [checker], verbose=0, criteria="strict", output_filename=str(report), output_format="json"
    )
    found = json.loads(report.read_text(encoding="utf-8"))[checker]
    return [
        f"{priority}: {check['name']}: {text}"
        for priority in ("high", "medium", "low")
        for check in found[f"{priority}_priorities"]
        if check["value"][0] < check["value"][1]
        for text in check["msgs"] or ["failed without a message"]
    ]


def cfchecks_messages(path: Path, folder: Path) -> list[str]:
    """Errors and warnings of cfchecks, for a copy that calls itself CF-1.8, the newest it knows."""
    import compliance_checker
    from cfchecker.cfchecks import CFChecker

    copy = folder / "as_cf_1_8.nc"
    shutil.copyfile(path, copy)
    with netCDF4.Dataset(copy, "a") as file:
        file.Conventions = "CF-1.8"
    areas, regions = folder / "areas.xml", folder / "regions.xml"
    areas.write_text(AREA_TYPES, encoding="utf-8")
    regions.write_text(REGIONS, encoding="utf-8")
    names = Path(compliance_checker.__file__).parent / "data" / "cf-standard-name-table.xml"
    checker = CFChecker(
        cfStandardNamesXML=str(names), cfAreaTypesXML=str(areas), cfRegionNamesXML=str(regions), silent=True
    )
    results = checker.checker(str(copy))
    places = {"global": results["global"], **results["variables"]}
    return [
        f"{kind}: {place}: {text}"
        for place, found in places.items()
        for kind in ("FATAL", "ERROR", "WARN")
        for text in found[kind]
    ]
