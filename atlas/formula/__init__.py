"""The formula language: checked trees, their text, their derivatives."""
