# Writes braille.txt: the dots of every braille pattern by its Unicode name, one
# line "codepoint dots" each. Python 3 standard library; Unicode data 14.0.0.
import unicodedata
for cp in range(0x2800, 0x2900):
    name = unicodedata.name(chr(cp))
    dots = name.removeprefix("BRAILLE PATTERN ").removeprefix("DOTS-")
    print(f"{cp:04X}", dots if dots != "BLANK" else "-")
