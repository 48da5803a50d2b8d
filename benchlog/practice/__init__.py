"""The practice bench: SCPI instruments around a modelled board."""
