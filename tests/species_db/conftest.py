import pytest

import species_db


@pytest.fixture(scope="session")
def lib() -> species_db.Library:
    return species_db.load()


@pytest.fixture(scope="session")
def records(lib: species_db.Library) -> list[species_db.Species]:
    return [lib[key] for key in lib]
