#!/usr/bin/env python3
"""Holds the codes that the sources give to failures against the table in src/base/codes.c: every code that is used has a row, and every
row is used. A code that reaches bal_error_set through a parameter is looked for where that function is called."""
import pathlib
import re
import sys

STRING = re.compile(r'"((?:[^"\\]|\\.)*)"')
CODE = re.compile(r"[a-z0-9]+(-[a-z0-9]+)*")


def without_comments(text):
    """The source with every comment as blanks, so that line numbers stay."""
    pattern = re.compile(r'//[^\n]*|/\*.*?\*/|"(?:[^"\\\n]|\\.)*"|\'(?:[^\'\\\n]|\\.)*\'', re.S)
    return pattern.sub(lambda m: m.group() if m.group()[0] in "\"'" else re.sub(r"[^\n]", " ", m.group()), text)


def arguments(text, start):
    """The arguments of a call whose opening parenthesis is at start, and where it ends."""
    parts, depth, begin, at = [], 0, start + 1, start
    while at < len(text):
        c = text[at]
        if c in "\"'":
            at += 1
            while text[at] != c:
                at += 2 if text[at] == "\\" else 1
        elif c in "([{":
            depth += 1
        elif c in ")]}":
            depth -= 1
            if depth == 0:
                return parts + [text[begin:at].strip()], at
        elif c == "," and depth == 1:
            parts.append(text[begin:at].strip())
            begin = at + 1
        at += 1
    raise ValueError("a call has no end")


def calls(text, name):
    """Arguments and position of each call of a function, its prototype and its definition too."""
    for match in re.finditer(r"\b%s\s*\(" % re.escape(name), text):
        yield arguments(text, match.end() - 1)[0], match.start()


def definitions(text):
    """Name, parameters and the body's range of every function."""
    for match in re.finditer(r"^(?:[A-Za-z_][\w \t\*]*?[\s\*])?(\w+)\(", text, re.M):
        parts, end = arguments(text, match.end() - 1)
        opening = re.match(r"\s*\{", text[end + 1:])
        if not opening:
            continue
        close = text.find("\n}", end)
        yield match.group(1), parts, end, close if close >= 0 else len(text)


def enclosing(text, position):
    for name, parameters, start, end in definitions(text):
        if start < position < end:
            return name, [re.findall(r"\w+", parameter)[-1] for parameter in parameters if re.search(r"\w", parameter)], text[start:end]
    return None, [], ""


def assigned(body, name):
    """The strings that a function puts into a variable of its own."""
    values = re.findall(r"\b%s\s*=(?!=)([^,;]*)" % re.escape(name), body) if re.fullmatch(r"\w+", name) else []
    return [code for value in values for code in STRING.findall(value)]


def from_table(text, expression):
    """The words that look like codes in a table of structures: of an expression such as signatures[s].code."""
    match = re.fullmatch(r"(\w+)\[\w+\]\.\w+", expression)
    table = match and re.search(r"\b%s\[[^\]]*\]\s*=\s*\{" % match.group(1), text)
    if not table:
        return []
    return [word for row in arguments(text, table.end() - 1)[0] for word in STRING.findall(row) if CODE.fullmatch(word)]


def line(text, position):
    return text.count("\n", 0, position) + 1


def used_codes(sources, name, index, seen, complaints):
    """Codes given as an argument of a function, with where; follows parameters to the functions that fill them."""
    found = []
    for path, text in sources.items():
        for parts, position in calls(text, name):
            if len(parts) <= index:
                continue
            argument, where = parts[index], f"{path}:{line(text, position)}"
            literals = STRING.findall(argument)
            if literals:
                found += [(code, where) for code in literals]
                continue
            if re.search(r"\bconst char \*", argument):
                continue  # a prototype, or the function itself
            inside, parameters, body = enclosing(text, position)
            local = assigned(body, argument) or from_table(text, argument)
            if argument in parameters:
                step = (inside, parameters.index(argument))
                if step not in seen:
                    seen.add(step)
                    found += used_codes(sources, *step, seen, complaints)
            elif local:
                found += [(code, where) for code in local]
            elif not re.search(r"\w(\.|->)code$", argument):  # else it is handed on from a failure, where it was counted
                complaints.append(f"{where}: cannot tell which codes {argument!r} may be")
    return found


def main():
    root = pathlib.Path(sys.argv[1] if len(sys.argv) > 1 else pathlib.Path(__file__).resolve().parents[2])
    sources = {str(path.relative_to(root)): without_comments(path.read_text()) for path in sorted(root.glob("src/**/*.[ch]"))}
    table = sources.pop("src/base/codes.c")
    rows = re.findall(r'\{\s*"([^"]+)",', table[table.index("codes[]"):])
    complaints = []
    found = used_codes(sources, "bal_error_set", 2, set(), complaints)
    used = {}
    for code, where in found:
        used.setdefault(code, where)
    for code, where in sorted(used.items()):
        if code not in rows:
            complaints.append(f"{where}: code {code!r} has no row in src/base/codes.c")
        if not CODE.fullmatch(code):
            complaints.append(f"{where}: {code!r} does not look like a code")
    for code in rows:
        if code not in used:
            complaints.append(f"src/base/codes.c: nothing uses {code!r}")
    if rows != sorted(set(rows)):
        complaints.append("src/base/codes.c: the rows are not in alphabetical order, or one is there twice")
    if len(found) < 5 or not rows:
        complaints.append("hardly any use or row was found: this check has lost its way")
    for complaint in complaints:
        print(complaint)
    print(f"{len(used)} codes used, {len(rows)} rows: {len(complaints)} complaints")
    return 1 if complaints else 0


if __name__ == "__main__":
    sys.exit(main())
