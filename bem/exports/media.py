"""Dielectrics, half-space and flat layers of a result as lines of its report."""

from __future__ import annotations

from typing import Any

from bem.exports.names import shown
from bem.geometry.planes import AXES
from bem.geometry.wording import metre_text

MOST_MEDIA = 12
WIDEST = 30


def surroundings_text(settings: dict[str, Any]) -> str:
    """Permittivity of the surroundings, with their loss if they have any."""
    prefix = "surroundings_"
    around = {
        key.removeprefix(prefix): value for key, value in settings.items() if key.startswith(prefix)
    }
    return _medium({"relative_permittivity": settings["relative_permittivity"], **around})


def media_lines(settings: dict[str, Any]) -> list[str]:
    """One line each for dielectrics and for flat layers, if there are any."""
    lines = []
    if found := settings.get("dielectrics"):
        names = [f"{shown(str(body['name']), WIDEST)} ({_medium(body)})" for body in found]
        lines.append(f"dielectrics: {_few(names)}")
    if half_space := settings.get("half_space"):
        lines.append(f"half-space {_half_space(half_space)}")
    if layers := settings.get("flat_layers"):
        lines.append(f"flat layers {_flat_layers(layers)}")
    return lines


def grounded_layers(settings: dict[str, Any]) -> bool:
    """Whether flat layers end at a grounded plane."""
    layers = settings.get("flat_layers", {})
    return bool(layers.get("grounded_below") or layers.get("grounded_above"))


def _medium(values: dict[str, Any]) -> str:
    text = f"{values['relative_permittivity']:g}"
    if values.get("loss_tangent") is not None:
        text += f", loss tangent {values['loss_tangent']:g}"
    if values.get("conductivity_S_per_m") is not None:
        text += f", conductivity {values['conductivity_S_per_m']:g} S/m"
    return text


def _half_space(values: dict[str, Any]) -> str:
    for axis in AXES:
        for side in ("below", "above"):
            if (at := values.get(f"{side}_{axis}_m")) is not None:
                return f"{side} {axis} = {metre_text(at)}: relative permittivity {_medium(values)}"
    return f"of relative permittivity {_medium(values)}"


def _flat_layers(values: dict[str, Any]) -> str:
    [(axis, at)] = [(axis, values[key]) for axis in AXES if (key := f"from_{axis}_m") in values]
    layers = [f"{metre_text(one['thickness_m'])} ({_medium(one)})" for one in values["layers"]]
    grounds = [side for side in ("below", "above") if values[f"grounded_{side}"]]
    grounded = f", grounded {' and '.join(grounds)}" if grounds else ""
    return f"from {axis} = {metre_text(at)} upward{grounded}: {_few(layers)}"


def _few(texts: list[str]) -> str:
    more = [f"{len(texts) - MOST_MEDIA} more"] if len(texts) > MOST_MEDIA else []
    return ", ".join([*texts[:MOST_MEDIA], *more])
