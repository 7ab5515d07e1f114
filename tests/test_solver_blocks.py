"""Many columns abreast: the same bits as one by one, and one that stops harms no other."""

import numpy as np
import pytest

from soiltemp import Layer, Material, Profile
from soiltemp.errors import SolverError
from soiltemp.solver.blocks import WIDTH
from soiltemp.solver.march import make_schedule, march, march_block
from soiltemp.solver.stage import NON_FINITE, NOT_CONVERGED, OUT_OF_RANGE, PIECE_FIELDS
from tests.helpers.columns import DAY, HOUR, column_of, inert

GRID = (np.linspace(0.0, 0.4, 17), np.linspace(0.4, 4.0, 25))


def block_case(columns, seed, profiles=4, forcings=3, days=40):
    """Columns of mixed profiles and forcings, with the start and the base flux of each."""
    rng = np.random.default_rng(seed)
    tables = []
    for _ in range(profiles):
        layers = []
        for part, thickness in (("top", 0.4), ("below", 3.6)):
            k, c = rng.uniform(0.3, 2.5), rng.uniform(1.5e6, 3.5e6)
            latent = float(rng.choice([0.0, rng.uniform(3e7, 2.5e8)]))
            material = Material(
                part, k, k * rng.uniform(1.0, 2.0), c, c * rng.uniform(0.6, 1.0), latent,
                freezing_point=float(rng.choice([0.0, -0.3])), freezing_range=float(rng.choice([0.01, 0.5])),
            )  # fmt: skip
            layers.append(Layer(material, thickness))
        tables.append(column_of(Profile(layers), *GRID).table)
    # one profile without water: its column of one piece rides among those of five
    tables.append(column_of(Profile([Layer(inert(1.0, 2e6), 0.4), Layer(inert(2.0, 2e6), 3.6)]), *GRID).table)
    width = max(table.shape[1] for table in tables)
    padded = np.stack([np.pad(table, ((0, 0), (0, width - table.shape[1]), (0, 0))) for table in tables])
    seconds = np.arange(0.0, days * DAY + 1, 6 * HOUR)
    day = seconds / DAY
    surfaces = np.stack(
        [
            rng.uniform(-2.0, 4.0) - rng.uniform(4.0, 12.0) * np.sin(2 * np.pi * day / 40 + rng.uniform(0, 6))
            + rng.normal(0, 3, day.size)
            for _ in range(forcings)
        ]
    )  # fmt: skip
    schedule = make_schedule(seconds, surfaces[0], np.arange(0.0, days * DAY + 1, 5 * DAY), max_step=3 * HOUR)
    surfaces = np.stack([np.interp(schedule.seconds, seconds, row) for row in surfaces])
    return {
        "tables": padded,
        "which": rng.integers(0, len(tables), columns),
        "schedule": schedule,
        "surfaces": surfaces,
        "forced_by": rng.integers(0, forcings, columns),
        "start": rng.uniform(-3.0, 8.0, (columns, 1)) + np.zeros(padded.shape[1]),
        "base_flux": rng.uniform(-0.2, 0.2, columns),
    }


def run_block(case, *, tolerance=0.05, threads="serial"):
    return march_block(
        case["tables"], case["which"], case["schedule"], case["surfaces"], case["forced_by"], case["start"],
        base_flux=case["base_flux"], watch=3, tolerance=tolerance, threads=threads,
    )  # fmt: skip


def run_alone(case, column, tolerance=0.05):
    own = case["schedule"].__class__(
        case["schedule"].seconds,
        case["surfaces"][case["forced_by"][column]],
        case["schedule"].parts,
        case["schedule"].row,
    )
    return march(
        case["tables"][case["which"][column]], own, case["start"][column], base_flux=case["base_flux"][column], watch=3,
        tolerance=tolerance,
    )  # fmt: skip


@pytest.mark.parametrize("tolerance", [np.inf, 0.02])
@pytest.mark.parametrize("columns", [1, 5, 33, 70])
def test_bits_equal_a_column_alone(columns, tolerance):
    """Numbers of columns that do not fill a block, mixed profiles and forcings; the tolerance sends many steps of many
    columns through sub-steps, out of the block and back."""
    case = block_case(columns, columns)
    block = run_block(case, tolerance=tolerance)
    assert (block.status == 0).all()
    frozen = 0
    for column in range(columns):
        alone = run_alone(case, column, tolerance)
        np.testing.assert_array_equal(block.temperature[column], alone.temperature, strict=True)
        np.testing.assert_array_equal(block.heat[column], alone.heat, strict=True)
        np.testing.assert_array_equal(block.end[column], alone.end, strict=True)
        frozen += int((alone.temperature[:, 5:] < 0).any())
        if tolerance == 0.02:
            assert alone.counters["rescues"] > 0
    assert frozen >= columns // 2


@pytest.mark.parametrize("columns", [5, 70, 2 * WIDTH])
def test_threads_and_company_leave_the_bits(columns):
    case = block_case(columns, 7 * columns)
    serial, parallel = run_block(case), run_block(case, threads="parallel")
    np.testing.assert_array_equal(serial.temperature, parallel.temperature, strict=True)
    np.testing.assert_array_equal(serial.heat, parallel.heat, strict=True)
    # the same columns in another order
    order = np.random.default_rng(1).permutation(columns)
    moved = dict(case)
    for name in ("which", "forced_by", "start", "base_flux"):
        moved[name] = case[name][order]
    np.testing.assert_array_equal(run_block(moved).temperature, serial.temperature[order], strict=True)


def spoilt(case, column, fault):
    """The case with one column that cannot go on; give its own profile and forcing, and the status it must report."""
    case = dict(case)
    tables, surfaces = case["tables"].copy(), case["surfaces"].copy()
    which, forced_by = case["which"].copy(), case["forced_by"].copy()
    if fault == "table":
        tables = np.concatenate([tables, tables[which[column]][None]])
        tables[-1, 20, :, PIECE_FIELDS.index("B")] = np.nan
        which[column] = tables.shape[0] - 1
        expected = {NON_FINITE, NOT_CONVERGED}
    else:
        surfaces = np.concatenate([surfaces, surfaces[forced_by[column]][None]])
        surfaces[-1, 60:] = np.nan if fault == "missing surface" else 5000.0
        forced_by[column] = surfaces.shape[0] - 1
        expected = {NON_FINITE, NOT_CONVERGED} if fault == "missing surface" else {OUT_OF_RANGE}
    case.update(tables=tables, surfaces=surfaces, which=which, forced_by=forced_by)
    return case, expected


@pytest.mark.parametrize("threads", ["serial", "parallel"])
@pytest.mark.parametrize("tolerance", [np.inf, 0.02])
@pytest.mark.parametrize("fault", ["table", "missing surface", "absurd surface"])
def test_a_column_that_stops_reports_it_and_harms_no_other(fault, tolerance, threads):
    columns, bad = 40, 17
    case = block_case(columns, 99)
    good = run_block(case, tolerance=tolerance, threads=threads)
    broken, expected = spoilt(case, bad, fault)
    block = run_block(broken, tolerance=tolerance, threads=threads)
    others = np.arange(columns) != bad
    assert int(block.status[bad]) in expected
    assert (block.status[others] == 0).all()
    np.testing.assert_array_equal(block.temperature[others], good.temperature[others], strict=True)
    np.testing.assert_array_equal(block.heat[others], good.heat[others], strict=True)
    np.testing.assert_array_equal(block.end[others], good.end[others], strict=True)
    # no numbers from where it stopped, and where it stopped is said
    assert np.isnan(block.end[bad]).all()
    assert np.isnan(block.temperature[bad, -1]).all()
    assert np.isnan(block.heat[bad, -1])
    assert 0 <= block.stopped[bad] < case["schedule"].parts.size
    before = case["schedule"].seconds[case["schedule"].row >= 0] < case["schedule"].seconds[block.stopped[bad]]
    assert np.isnan(block.temperature[bad, ~before][1:]).all()
    if fault != "table":  # what came before the fault is the good column's
        np.testing.assert_array_equal(block.temperature[bad, before], good.temperature[bad, before])
        assert before.sum() > 1
    # alone it is an error, and the same status
    with pytest.raises(SolverError):
        run_alone(broken, bad, tolerance)


def test_every_column_bad():
    case = block_case(3, 5)
    case["surfaces"] = np.full_like(case["surfaces"], 5000.0)
    block = run_block(case)
    assert (block.status == OUT_OF_RANGE).all()
    assert np.isnan(block.end).all()
