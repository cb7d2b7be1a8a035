"""The content files of a community, read and checked: typed values, and nothing computed."""

from moonwrit.content.load import Content, load, schemas

__all__ = ["Content", "load", "schemas"]
