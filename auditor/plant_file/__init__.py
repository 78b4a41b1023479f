"""The plant file: from plant.toml to a checked plant in SI, or to every fault of the file at once."""

from auditor.plant_file.plant_reader import FILE_NAME, read_plant
from auditor.plant_file.schema import plant_schema

__all__ = ["FILE_NAME", "plant_schema", "read_plant"]
