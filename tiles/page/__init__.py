"""The page of a static tile set: html, css and js shipped as package data."""
