"""The caution that travels with every file whose geometry someone may build from, print or cut."""

CAUTION_SHORT = "Not a manufacturing drawing: check dimensions before making anything."
CAUTION = f"{CAUTION_SHORT[:-1]}, and follow local codes and licensed practice."
