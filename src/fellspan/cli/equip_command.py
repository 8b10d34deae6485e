"""`fellspan equip`: which antennas and radios close a link, and how far would each reach?"""

from pathlib import Path
from typing import Annotated, get_args

import typer

from fellspan.cli.choices import one_of
from fellspan.vocabulary import GapPolicy, Polarization

_TEXT = "TEXT"


def equip_command(
    where: Annotated[
        list[str] | None,
        typer.Argument(metavar="[STUDY | A B]", help="Study file (.toml), or two positions.", show_default=False),
    ] = None,
    link: Annotated[str | None, typer.Option(metavar="NAME", help="Link of the study.")] = None,
    antennas: Annotated[
        list[str] | None,
        typer.Option(
            "--antennas",
            "--antenna",
            metavar="NAME",
            help="Of the study or the catalogue; again, or with ';' between. All that fit if left out.",
        ),
    ] = None,
    radio: Annotated[
        list[str] | None, typer.Option(metavar="NAME", help="Radio of the study to compare; may be given again.")
    ] = None,
    power: Annotated[str | None, typer.Option(metavar=_TEXT, help="Transmit power, as in '23 dBm'.")] = None,
    threshold: Annotated[str | None, typer.Option(metavar=_TEXT, help="Level needed, as in '-72 dBm'.")] = None,
    frequency: Annotated[str | None, typer.Option(metavar=_TEXT, help="Without a study: as in '5.8 GHz'.")] = None,
    channel: Annotated[str | None, typer.Option(metavar=_TEXT, help="Channel width, as in '20 MHz'.")] = None,
    polarization: Annotated[
        str, typer.Option(metavar="|".join(get_args(Polarization)), help="Without a study.")
    ] = "vertical",
    rule: Annotated[
        str | None, typer.Option(metavar="ROW", help="Power rule that settings keep (docs/rules.md).")
    ] = None,
    target: Annotated[
        str | None, typer.Option(metavar="PERCENT", help="Availability over the year, as in 99.99.")
    ] = None,
    margin: Annotated[str | None, typer.Option(metavar=_TEXT, help="Margin asked in clear air, as in '10 dB'.")] = None,
    wind: Annotated[str | None, typer.Option(metavar=_TEXT, help="Design gust at the antenna, as in '45 m/s'.")] = None,
    arm: Annotated[
        str, typer.Option(metavar=_TEXT, help="Height of the antenna above the last support of its mast.")
    ] = "1 m",
    sway: Annotated[
        float | None, typer.Option(metavar="DEG", help="Standard deviation of mast sway and twist, both ends.")
    ] = None,
    off_aim: Annotated[float, typer.Option(metavar="DEG", help="Error of aim whose cost is told.")] = 1.0,
    end: Annotated[str, typer.Option(metavar="both|a|b", help="Which end gets the antenna.")] = "both",
    distance: Annotated[
        str | None, typer.Option(metavar=_TEXT, help="A free path of this length instead of terrain, as in '12 km'.")
    ] = None,
    at: Annotated[
        str | None, typer.Option(metavar="POSITION", help="With --distance: where it is, for maps of climate.")
    ] = None,
    rain: Annotated[
        float | None, typer.Option(metavar="MM/H", help="Without a study: rain exceeded for 0.01 % of the year.")
    ] = None,
    ground: Annotated[
        list[str] | None,
        typer.Option("--ground", "--terrain", metavar="FILE", help="Two points: raster of bare ground."),
    ] = None,
    surface: Annotated[
        list[str] | None, typer.Option(metavar="FILE", help="Two points: raster of the surface.")
    ] = None,
    gaps: Annotated[
        str, typer.Option(metavar="|".join(get_args(GapPolicy)), help="Two points: what gaps in the rasters are.")
    ] = "error",
    height_a: Annotated[str | None, typer.Option(metavar=_TEXT, help="Two points: antenna at A.")] = None,
    height_b: Annotated[str | None, typer.Option(metavar=_TEXT, help="Two points: antenna at B.")] = None,
    catalogue: Annotated[Path | None, typer.Option(metavar="FILE", help="Antennas of your own.")] = None,
    reach: Annotated[bool, typer.Option("--reach/--no-reach", help="Search how far each pair would reach.")] = True,
    as_json: Annotated[bool, typer.Option("--json", help="Print results as JSON instead of the page.")] = False,
    out: Annotated[
        Path | None, typer.Option("--out", metavar="FILE.html", help="Write a page with the chart of reach.")
    ] = None,
) -> None:
    """Which antennas and radios close the link, and how far would each reach?"""
    from fellspan.cli.equip_asked import EquipAsked, compared
    from fellspan.design.equip_result import EquipEnd

    chosen_end: EquipEnd = one_of(end, get_args(EquipEnd), "--end")
    gap_policy: GapPolicy = one_of(gaps, get_args(GapPolicy), "--gaps")
    field: Polarization = one_of(polarization, get_args(Polarization), "--polarization")
    result = compared(
        EquipAsked(
            where=where or (),
            link=link,
            ground=ground or (),
            surface=surface or (),
            gaps=gap_policy,
            height_a=height_a,
            height_b=height_b,
            distance=distance,
            at=at,
            rain=rain,
            frequency=frequency,
            polarization=field,
            antennas=antennas or (),
            catalogue=catalogue,
            radios=radio or (),
            power=power,
            threshold=threshold,
            channel=channel,
            rule=rule,
            target=target,
            margin=margin,
            wind=wind,
            arm=arm,
            sway=sway,
            off_aim=off_aim,
            end=chosen_end,
            reach=reach or out is not None,
        )
    )
    if as_json:
        from fellspan.exports.equipment import equipment_text

        typer.echo(equipment_text(result), nl=False)
    else:
        from fellspan.cli.equip_page import equip_lines
        from fellspan.cli.layout import Ink, colours_wanted

        typer.echo("\n".join(equip_lines(result, ink=Ink(colours=colours_wanted()))))
    if out is not None:
        from fellspan.report.equip_page import write_equip_page

        written = write_equip_page(result, out)
        if not as_json:
            typer.echo(f"\npage: {written}")
