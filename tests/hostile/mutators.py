"""Ways to spoil a file: by its bytes, by its rows, by its keys, by the parts of an expression."""

from __future__ import annotations

import random
import re
from collections.abc import Callable

NUMBERS = (
    "0", "-0", "-1", "1", "2", "3", "7", "0.5", "-0.5", "nan", "inf", "-inf", "NaN", "Infinity", "NA", "null", "None",
    "1e308", "-1e308", "1e400", "1e-308", "1e-320", "1e13", "1e11", "1e6", "1e-6", "1e-13", "1e18", "0x10", "0b1",
    "1_000", "1,5", "1.2.3", "--1", "+5", ".5", "5.", "e5", "1e", "１２", "٣", "9223372036854775807",
    "9223372036854775808", "-9223372036854775809", "18446744073709551616", "9007199254740993", "9" * 400, "0" * 5000,
    "1.0000000000000002", "0.1", "4.9e-324", "2.2250738585072014e-308", "true", "\x1b[31m1", "1;2", "=1+1", "²",
)  # fmt: skip
TEXTS = (
    "[bold]x[/bold]", "[/]", "[link=http://x]", "<script>alert(1)</script>", "\x1b[2J\x1b[31m", "\u202egnp.exe",
    "$x^2$", r"$\frac{1}{0}$", "=cmd()", "@SUM(A1)", "+1", "-1", "\t=1", "a\nb", "a\r\nb", "a\x00b",
    "../../etc/passwd", "",
    " ", "\ufeff", "\u200b", "x" * 90, "x" * 5000, ":smile:", "%s%n", "{0}", "${HOME}", "`id`", "'; DROP", '"', "\\",
    "soma", "excitation", "shared", "é", "e\u0301", "日本語", "\U0001f9e0", "\ud7ff", "site", "variance_x_mV2", "NaN",
)  # fmt: skip
PATHS = (
    "/dev/null", "/dev/zero", "/dev/full", "/dev/stdin", "/dev/random", "/etc/passwd", "/etc", ".", "..", "/", "",
    "../cell.swc", "./cell.swc", "none.swc", "scenario.toml", "list.csv", "a\x00b", "x" * 300, "x/" * 400,
    "~/cell.swc",
    "pipe", "loop", "/proc/self/mem", "/proc/self/environ", "file:///etc/passwd", "http://localhost/x", "CELL.SWC",
)  # fmt: skip
BYTES = (
    b"\x00", b"\xff", b"\xfe\xff", b"\xff\xfe", b"\xef\xbb\xbf", b"\r", b"\n", b"\r\n", b"\r\r\n", b"\t", b"\x0b",
    b"\x0c", b"\x1a", b"\x1b[31m", b"\xc2\xa0", b"\xe2\x80\xa8", b"\xe2\x80\xae", b"\x85", b"#", b",", b";", b'"',
    b"'",
    b"[", b"]", b"{", b"}", b"=", b"-", b".", b"e", b"0", b"9", b" ", b"\\", b"\xed\xa0\x80", b"\xf4\x90\x80\x80",
)  # fmt: skip

Draw = random.Random


def bytes_spoiled(data: bytes, draw: Draw) -> bytes:
    """One change of a file's bytes."""
    at = draw.randrange(len(data) + 1)
    to = min(len(data), at + draw.choice((1, 1, 2, 5, 20, 200)))
    ways: tuple[Callable[[], bytes], ...] = (
        lambda: data[:at] + draw.choice(BYTES) + data[at:],
        lambda: data[:at] + draw.choice(BYTES) + data[to:],
        lambda: data[:at] + data[to:],
        lambda: data[:at] + data[at:to] * draw.choice((2, 3, 50)) + data[to:],
        lambda: data[:at],
        lambda: data[at:],
        lambda: data[:at] + draw.randbytes(draw.choice((1, 4, 30))) + data[to:],
        lambda: data[:at] + bytes([data[at] ^ (1 << draw.randrange(8))]) + data[at + 1 :] if at < len(data) else data,
        lambda: _recoded(data, draw),
        lambda: data.replace(b"\n", draw.choice((b"\r\n", b"\r", b"\r\r\n", b"\n\n", b"\x0b", b"", b" "))),
        lambda: draw.choice(BYTES) + data,
        lambda: data + draw.choice(BYTES),
    )
    return draw.choice(ways)()


def _recoded(data: bytes, draw: Draw) -> bytes:
    coding = draw.choice(("utf-16", "utf-16-le", "utf-32", "utf-8-sig", "cp037"))
    return data.decode("latin-1").encode(coding, "replace")


def gently_spoiled(text: str, draw: Draw) -> str:
    """One number of a text multiplied by a factor of its own: mostly still a good file, with another answer."""
    found = list(re.finditer(r"(?<![\w.])-?\d+\.?\d*(?![\w.])", text))
    if not found:
        return text
    one = draw.choice(found)
    factor = draw.choice((-1.0, 10 ** draw.uniform(-1, 1), 10 ** draw.uniform(-4, 4)))
    word = repr(float(one.group()) * factor) if "." in one.group() or draw.random() < 0.3 else str(draw.randrange(12))
    return text[: one.start()] + word + text[one.end() :]


def rows_spoiled(text: str, draw: Draw) -> str:
    """One change of the rows of an SWC text."""
    lines = text.split("\n")
    rows = [n for n, line in enumerate(lines) if line.strip() and not line.startswith("#")]
    if not rows:
        return text + "1 1 0 0 0 1 -1\n"
    n = draw.choice(rows)
    words = lines[n].split()
    k = draw.randrange(max(len(words), 1))
    other = draw.choice(rows)
    way = draw.randrange(14)
    if way <= 3 and words:
        words[k] = draw.choice(NUMBERS)
    elif way == 4 and words:
        del words[k]
    elif way == 5:
        words.insert(k, draw.choice(NUMBERS))
    elif way == 6 and words:
        words[-1] = (lines[other].split() or ["0"])[0]
    elif way == 7 and words:
        words[0] = (lines[other].split() or ["0"])[0]
    elif way == 8:
        words[1:2] = [draw.choice(("0", "1", "2", "3", "4", "5", "7", "-5", "12", "274", "2147483648"))]
    elif way == 9 and len(words) > 5:
        words[2:5] = lines[other].split()[2:5]
    elif way == 10 and len(words) > 5:
        scale = draw.choice((1e-9, 1e-3, 1e3, 1e6, 1e11))
        words[k] = _scaled(words[k], scale)
    elif way == 11:
        lines[n], lines[other] = lines[other], lines[n]
        return "\n".join(lines)
    elif way == 12:
        return "\n".join([*lines[:n], *([lines[n]] * draw.choice((0, 0, 2, 3))), *lines[n + 1 :]])
    else:
        return "\n".join([*lines[:n], draw.choice(("", "#", "# " + draw.choice(TEXTS), "\t", "//", ";")), *lines[n:]])
    lines[n] = draw.choice((" ", " ", " ", "\t", ",", "  ", ";")).join(words)
    return "\n".join(lines)


def _scaled(word: str, factor: float) -> str:
    try:
        return repr(float(word) * factor)
    except ValueError:
        return word


def keys_spoiled(text: str, draw: Draw) -> str:
    """One change of the keys or values of a scenario."""
    lines = text.split("\n")
    n = draw.choice([i for i, line in enumerate(lines) if line.strip()] or [0])
    other = draw.randrange(len(lines))
    way = draw.randrange(12)
    if way <= 4:
        start = lines[n].find("=") + 1
        values = [m.span(1) for m in re.finditer(r'=\s*("[^"]*"|\[[^\]]*\]|\{[^}]*\}|[^\s,}\]]+)', lines[n])]
        values += [m.span() for m in re.finditer(r'"[^"]*"|-?\d[\d.]*|inf', lines[n]) if m.start() >= start > 0]
        if values:
            low, high = draw.choice(values)
            lines[n] = lines[n][:low] + _value(draw) + lines[n][high:]
    elif way == 5:
        del lines[n]
    elif way == 6:
        lines.insert(other, lines[n])
    elif way == 7:
        lines[n], lines[other] = lines[other], lines[n]
    elif way == 8:
        words = re.findall(r"[A-Za-z_]{3,}", lines[n])
        if words:
            word = draw.choice(words)
            at = draw.randrange(len(word))
            lines[n] = lines[n].replace(word, word[:at] + draw.choice("xZ_9é ") + word[at + draw.randrange(2) :], 1)
    elif way == 9:
        lines.insert(n, draw.choice(_EXTRA_LINES))
    elif way == 10:
        lines.insert(n, f"{draw.choice(('title', 'name', 'x', 'rate_Hz'))} = {_value(draw)}")
    else:
        lines = [_path_changed(line, draw) for line in lines]
    return "\n".join(lines)


def _path_changed(line: str, draw: Draw) -> str:
    key = line.partition(" ")[0]
    return f"{key} = {_quoted(draw.choice(PATHS))}" if key in ("morphology", "synapses") else line


def _value(draw: Draw) -> str:
    way = draw.randrange(8)
    if way < 3:
        return draw.choice(NUMBERS)
    if way < 5:
        return _quoted(draw.choice(TEXTS))
    return draw.choice(
        (
            "[]", "{}", "[1]", "[1, 2]", "[inf, -inf]", "[nan, nan]", "[0, 0]", "[-1, 1e9]", "true", "1979-05-27",
            "07:32:00", "{ swc_id = 1 }", "{ swc_id = 99 }", '["axon"]', '["soma"]', '[["soma"]]', "{ a.b.c = 1 }",
            "[" * 400 + "]" * 400, '"""x"""', "'x'", "{ expression = 't*exp(-t)' }", "{ alpha_ms = 1e-300 }",
            "{ rise_ms = 1e-9, decay_ms = 1e9 }", "{ decay_ms = 1e300 }", "{ dead_time_ms = 499.99 }",
            "{ dead_time_ms = 300 }", "{ order = 1e6 }", "{ order = 1.5 }", "{ path_um = 50 }", "1e3", "1e-3", "1e5",
            "-70.0", "50", "{ expression = '9**9**9' }", "{ expression = '__import__(\"os\")' }",
        )
    )  # fmt: skip


def _quoted(text: str) -> str:
    """A TOML basic string with this text, or now and then the text as it is."""
    inner = text.replace("\\", "\\\\").replace('"', '\\"')
    return '"' + "".join(c if c >= " " and c != "\x7f" else f"\\u{ord(c):04x}" for c in inner) + '"'


_EXTRA_LINES = (
    "[[input]]", "[[site]]", "[cell]", "[membrane]", "[x]", "[[electrode]]\nsite = 'soma'", "[[x.y.z]]", "][", "= 1",
    "[[electrode]]\nsite = 'soma'\nmode = 'voltage clamp'\nholding_mV = -60",
    "[[electrode]]\nsite = 'soma'\nseries_resistance_MOhm = 1e9\npipette_capacitance_pF = 1e9",
    "[[site]]\nname = 'again'\nat = { swc_id = 3, fraction = 0.4 }", "# comment", "\x00", "'''", '"""',
    "shares = [{ input = 'inhibition', fraction = 0.2 }]", "size_cv = 0.3", "correlation = 1.0", "rate_Hz = 0",
)  # fmt: skip


def cells_spoiled(text: str, draw: Draw) -> str:
    """One change of the cells of a CSV list."""
    lines = re.split(r"\r?\n", text)
    n = draw.randrange(len(lines))
    cells = lines[n].split(",")
    k = draw.randrange(len(cells))
    other = draw.randrange(len(lines))
    way = draw.randrange(10)
    if way <= 3:
        cells[k] = draw.choice((draw.choice(NUMBERS), draw.choice(TEXTS), f'"{cells[k]}"', f" {cells[k]} ", ""))
    elif way == 4:
        del cells[k]
    elif way == 5:
        cells.insert(k, draw.choice(NUMBERS))
    elif way == 6:
        lines[n], lines[other] = lines[other], lines[n]
        cells = lines[n].split(",")
    elif way == 7:
        return "\r\n".join([*lines[:n], *([lines[n]] * draw.choice((0, 2, 40))), *lines[n + 1 :]])
    elif way == 8:
        return text.replace(",", draw.choice((";", "\t", ", ", ",,", " ,")))
    else:
        cells[k] = draw.choice(('"', '""', '"a\nb"', '"1', '1"', "'1'", "#", "swc_id", "fraction"))
    lines[n] = ",".join(cells)
    return draw.choice(("\r\n", "\n")).join(lines)


ATOMS = (
    "t", "pi", "0", "1", "2", "3", "0.5", "12", "13", "1e11", "1e12", "1e-300", "1e308", "1e999", "9", "1j", "True",
    "None", "'a'", "b'a'", "...", "x", "e", "E", "I", "oo", "nan", "inf", "t1", "т", "ｔ", "２", "π", "10**11", "1_0",
    "0x1f", "1e-12", "0.1", "7.123456789012345",
)  # fmt: skip
HOSTILE = (
    "__import__('os').system('touch OWNED')", "open('OWNED','w')", "t.__class__",
    "t.__class__.__mro__[1].__subclasses__()", "(lambda: 1)()", "[t for t in (1,)]", "eval('1')", "exec('1')",
    "9**9**9", "((9**9)**9)**9", "t if t else 1",
    "t[0]", "f'{t}'", "exp(*[1])", "exp(t, evaluate=False)", "exp", "sin(cos(exp(t)))", "exp(exp(t))", "t**-1",
    "t**0.5", "t**t", "1/t", "1/0", "t//2", "t%2", "t@t", "~t", "not t", "t and t", "t<1", "t==t", "t:=1",
    "(t:=1)", "yield",
    "t,", "(t,t)", "{t}", "{t:t}", "exp(t)", "exp(-t**2)", "sin(t)", "exp(-t)/t", "exp(-t)*oo", "getattr(t,'x')",
    "exp(-t)#",
    "exp(-t);1", "exp(-t)\n1", "\\", "(" * 90 + "t" + ")" * 90, "-" * 200 + "t", "t" + "+t" * 100, "(t+1)**12",
    "((t+1)**12)**12", "(sin(t)+cos(t)+exp(t)+t+1)**12", "(((t+1)**12)**12)**12", "cos(t)**12*sin(t)**12",
    "((((((9**12)**12)**12)**12)**12)**12)**12", "exp(-t)**12", "exp(1e11)", "exp(-1e11)*exp(-t)", "exp(-t/1e-300)",
    "exp(-1e11*t)-exp(-1e11*t)", "0*exp(-t)", "exp(-t)-exp(-t*1.0000000000000002)", "-exp(-t)", "exp(-t)*cos(1e11*t)",
    "exp(-t*(1+exp(1)))", "exp(-t*sin(1))", "exp(-t*cos(2))", "exp(-t)*exp(t)", "exp(-t)*exp(-0*t)", "exp(-t-t**2)",
)  # fmt: skip
FORMS = ("({} + {})", "({} - {})", "{}*{}", "{}/{}", "{}**{}", "exp(-{}/{})", "exp(-{})*{}", "exp({})*{}", "cos({}*{})")


def expression_spoiled(text: str, draw: Draw) -> str:
    """One change of a kernel expression."""
    way = draw.randrange(8)
    if way == 0:
        return draw.choice(HOSTILE)
    if way == 1:
        return draw.choice(("{}*({})", "({}) + ({})", "exp(-t)*({1})", "({}) - {}", "{}/({})")).format(
            text, draw.choice(HOSTILE)
        )
    parts = re.findall(r"[A-Za-z_]+|[\d.]+|\*\*|[-+*/()]", text) or ["t"]
    k = draw.randrange(len(parts))
    if way in (2, 3):
        parts[k] = draw.choice(ATOMS)
    elif way == 4:
        parts[k] = draw.choice(("+", "-", "*", "/", "**", "(", ")", ",", "exp", "sin", "cos", "tan", "sqrt", "log"))
    elif way == 5:
        del parts[k]
    elif way == 6:
        return draw.choice(FORMS).format(text, draw.choice((*ATOMS[:12], "t*exp(-t/3)", "cos(t)")))
    else:
        at = draw.randrange(len(text) + 1)
        return text[:at] + draw.choice((" ", "\t", "\n", "(", ")", ".", "_", "\x00", "²", "·", "−", "#")) + text[at:]
    return "".join(parts)
