"""[candidates]: what all pairs of hubs and places have in common; the keys and their help. Looks nothing up."""

from pydantic import Field, model_validator

from fellspan.study.fields import AntennaHeight, Length, Loss, Name, Percent
from fellspan.study.table import Table


class CandidatesTable(Table):
    """[candidates]: what all pairs of hubs and places have in common."""

    radio: Name | None = Field(
        default=None, description="Name of the radio; needed where the file has several.", examples=["5 GHz sector"]
    )
    antenna_hub: Name | None = Field(
        default=None, description="Antenna of the hubs, where their file states none.", examples=["beacon sector"]
    )
    antenna_place: Name | None = Field(default=None, description="Antenna at every place.", examples=["panel"])
    height_hub: AntennaHeight | None = Field(
        default=None, description="Height at hubs whose file states none.", examples=["12 m above ground"]
    )
    height_place: AntennaHeight | None = Field(
        default=None, description="Height at places whose file states none.", examples=["6 m above ground"]
    )
    feeder_loss_hub: Loss = Field(default=0.0, description="Cable and connectors at a hub.", examples=["1 dB"])
    feeder_loss_place: Loss = Field(default=0.0, description="Cable and connectors at a place.", examples=["0.5 dB"])
    wanted_margin: Loss = Field(default=10.0, description="Margin that the signal must have.", examples=["10 dB"])
    target_availability: Percent | None = Field(
        default=None, gt=0.0, lt=100.0, description="Share of the year that is asked.", examples=["99.9 %"]
    )
    rule: Name | None = Field(default=None, description="Power rule that the pairs go by.", examples=["fcc-15.247-5g8"])
    min_distance: Length | None = Field(default=None, description="Nearer places are left out.", examples=["200 m"])
    max_distance: Length | None = Field(
        default=None, description="Places farther off are left out.", examples=["15 km"]
    )

    @model_validator(mode="after")
    def _distances_in_order(self) -> "CandidatesTable":
        if self.min_distance is not None and self.max_distance is not None and self.min_distance >= self.max_distance:
            raise ValueError(
                f"min_distance, {self.min_distance:g} m, is not below max_distance, {self.max_distance:g} m"
            )
        return self
