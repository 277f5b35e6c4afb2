"""Names that the whole add-on shares."""

PACKAGE = __package__
VERSION = "0.1.0"
TAB = "Sunlight"
COLLECTION = "causticload results"
TAG = "causticload_result"  # custom property on everything the add-on makes
