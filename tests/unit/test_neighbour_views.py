"""What terminal and pages say of neighbours, and the cautions that reach the links."""

from dataclasses import replace

from exports_made_plan import made_plan
from made_neighbours import at_one_mast, planned, study, two_parallel

from fellspan.cli.layout import WIDTH, Ink
from fellspan.cli.neighbour_lines import neighbour_lines
from fellspan.links.interference_result import StudyInterference
from fellspan.planning.neighbours import neighbours_of, with_cautions
from fellspan.planning.plan import LinkPlan
from fellspan.report.neighbours import neighbours_view
from fellspan.report.pages import _environment

PLAIN = Ink(colours=False)


def page(found: StudyInterference | None, link: str | None = None) -> str:
    view = neighbours_view(replace(made_plan(), interference=found), link)
    assert view is not None
    module = _environment().get_template("neighbours.html.j2").module
    return str(module.overview(view) if link is None else module.of_link(view))  # type: ignore[attr-defined]


def test_the_terminal_names_the_worst_pair_first() -> None:
    found = study(*two_parallel(apart_m=200.0))
    lines = neighbour_lines(found, PLAIN)
    assert lines[0] == "Neighbours"
    assert all(len(line) <= WIDTH for line in lines)
    text = " ".join(" ".join(lines).split())
    assert found.worst is not None
    assert found.worst in text
    first = found.receivers[0]
    row = next(line for line in lines if f"{first.end} of {first.link}" in line)
    assert f"{first.c_i_db:.1f}" in row
    assert f"{first.threshold_degradation_db:.1f}" in row


def test_the_terminal_names_conflicts_and_sites() -> None:
    text = " ".join(" ".join(neighbour_lines(study(*at_one_mast(low_first=True, heights=(30.0, 30.5))), PLAIN)).split())
    assert "High/low conflict at 'Hill'" in text
    assert "too near each other at 'Hill'" in text


def test_where_nobody_is_heard_all_views_say_so() -> None:
    far = planned("A", *(one[0].a.position for one in two_parallel()))
    found = study(far)
    assert "No link of this study hears another" in " ".join(neighbour_lines(found, PLAIN))
    assert "No link of this study hears another" in page(found)
    assert "No other link of the study is heard" in page(found, "A")


def test_the_overview_lists_the_worst_first_and_the_page_of_a_link_what_harms_it() -> None:
    found = study(*two_parallel(apart_m=200.0))
    overview = page(found)
    assert overview.index("Worst pair") < overview.index("<table>")
    first = found.receivers[0]
    assert overview.index(first.site, overview.index("<tbody>")) < overview.index(
        found.receivers[1].site, overview.index("<tbody>")
    )
    own = page(found, "South")
    assert "North west" in own
    assert "over the terrain" not in own
    assert "free space, without terrain" in own


def test_names_are_text_on_the_pages() -> None:
    one, other = two_parallel()
    spoilt = replace(other[0], name="<b>North</b>"), replace(other[1], name="<b>North</b>")
    assert "<b>North" not in page(study(one, spoilt))


def plan_of(given) -> LinkPlan:
    return replace(made_plan().links[0], link=given[0], result=given[1])


def test_a_harmed_link_carries_a_caution_and_the_others_stay_as_they_are() -> None:
    one, other = two_parallel(apart_m=200.0)
    calm = planned("Calm", one[0].a.position, other[0].b.position)
    found = study(one, other)
    harmed, same = with_cautions([plan_of(one), plan_of(calm)], found)
    assert any("raise the threshold at 'South east'" in caution for caution in harmed.result.cautions)
    assert same.result.cautions == ()


def test_one_link_with_levels_is_no_neighbourhood() -> None:
    one, other = two_parallel()
    mute = planned("Mute", other[0].a.position, other[0].b.position, carrier_dbm=None)
    plans = [plan_of(one), plan_of(mute)]
    assert neighbours_of(plans, (), None, median_k=4.0 / 3.0) is None  # type: ignore[arg-type]
    assert with_cautions(plans, None) == tuple(plans)
