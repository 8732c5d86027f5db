"""The words for checks, goals and positions: one place, so that terminal, page and files say the same."""

from __future__ import annotations

CHECKS: dict[str, str] = {
    "ctr_margin": "CTR margin",
    "output_low": "Output low",
    "output_high": "Output high",
    "edge_time": "Edge time",
    "delay": "Delay",
    "distortion": "Pulse distortion",
    "shortest_pulse": "Delay within shortest pulse",
    "power": "Average power",
    "led_current": "LED current",
    "led_current_low": "LED current, start of CTR curve",
    "led_current_high": "LED current, end of CTR curve",
    "led_power": "LED power",
    "led_dark": "LED dark when off",
    "driver_current": "Driver current",
    "input_current": "Input current when on",
    "reverse_voltage": "LED reverse voltage",
    "switching_current": "LED current that switches the output",
    "sink_current": "Output sink current",
    "supply_low": "Supply, lowest",
    "supply_high": "Supply, highest",
    "deliverable_current": "Current the coupler can deliver",
    "collector_current": "Collector current",
    "collector_voltage": "Collector voltage",
    "output_power": "Output power",
    "total_power": "Package power",
    "r_led_power": "LED resistor power",
    "r_led_voltage": "LED resistor voltage",
    "r_shunt_power": "Shunt resistor power",
    "r_load_power": "Load resistor power",
    "r_load_voltage": "Load resistor voltage",
    "r_be_power": "Base resistor power",
    "withstand": "Withstand voltage",
    "working_voltage": "Working voltage",
    "creepage": "Creepage",
}

POSITIONS: dict[str, str] = {
    "r_led": "LED resistor",
    "r_load": "Load resistor",
    "r_be": "Base-emitter resistor",
    "r_shunt": "LED shunt",
}

TIMES: dict[str, str] = {
    "edge_on": "Edge, LED lights",
    "edge_off": "Edge, LED goes dark",
    "storage": "Storage",
    "delay_on": "Delay, LED lights",
    "delay_off": "Delay, LED goes dark",
    "distortion": "Pulse distortion",
}


def check_label(name: str) -> str:
    """A check's name in words."""
    return CHECKS.get(name, name.replace("_", " "))
