"""Write the README's tables anew from the forms and tables: ``python -m tests.readme_tables``."""

import re
from pathlib import Path

from relaycfg.files import key_table, name_lists

README = Path(__file__).resolve().parent.parent / "README.md"
PARTS = {"keys": key_table, "names": name_lists}


def rewritten(text: str) -> str:
    """The README with the parts between its markers made anew."""
    for name, make in PARTS.items():
        before, rest = re.split(rf"(?<=<!-- {name}: begin, made by python -m tests.readme_tables -->\n)", text)
        text = f"{before}{make().strip()}\n{rest[rest.index(f'<!-- {name}: end -->') :]}"
    return text


if __name__ == "__main__":
    README.write_text(rewritten(README.read_text()))
