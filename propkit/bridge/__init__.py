"""The one place for Cantera and CoolProp."""
