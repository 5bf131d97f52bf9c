"""Bounded numbers for pydantic fields, with a sentence that says what is allowed."""

from pydantic import AfterValidator, BaseModel, ConfigDict


def between(low: float, high: float, what: str, unit: str = "") -> AfterValidator:
    """Validator of a number from low to high, ends included; NaN fails."""

    def check(value: float | None) -> float | None:
        if value is None or low <= value <= high:
            return value
        raise ValueError(f"{what} must be {low:g} to {high:g}{unit and ' ' + unit}, not {value:g}")

    return AfterValidator(check)


class Described(BaseModel):
    """Base of what is read from a file: unknown keys are faults, nothing changes later."""

    model_config = ConfigDict(extra="forbid", frozen=True)
