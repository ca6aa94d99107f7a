#!/usr/bin/env python3
"""Bad and odd network files, and what has to come of each: made by code, so that nothing large has to be kept.

usage: hostile_networks.py FOLDER

writes all of them into a folder, with what is expected of each in manifest.json. test_hostile_networks.py runs them.
"""
import gzip
import io
import json
import os
import random
import sys

HEAD = '<?xml version="1.0"?>\n<BIF VERSION="0.3">\n<NETWORK>\n'
COIN = "<VARIABLE><NAME>coin</NAME><OUTCOME>heads</OUTCOME><OUTCOME>tails</OUTCOME></VARIABLE>\n"
TAIL = "</NETWORK>\n</BIF>\n"
SOUND = HEAD + COIN + "<DEFINITION><FOR>coin</FOR><TABLE>0.5 0.5</TABLE></DEFINITION>\n" + TAIL
NO_ENTITIES = "entity declarations are not accepted"
MIB = 1 << 20


class Case:
    def __init__(self, name, content, exit=0, words=(), place=None, code=None, warned=None, header=None, sealed=False,
                 environment=None, stack=None, seconds=1.0, mebibytes=256):
        """content: text, bytes, or a function that gives chunks of bytes one after another.
        place, code: "LINE:COLUMN" and code of the refusal.  warned: codes of the warnings, when they are not to be none.
        header: the names of the variables as `draw` writes them.  sealed: the program is watched, and may open nothing after the file.
        stack: KiB of stack that the program gets."""
        self.name, self.content, self.exit, self.words, self.place, self.code = name, content, exit, list(words), place, code
        self.warned, self.header, self.sealed, self.environment = warned or [], header, sealed, environment or {}
        self.stack, self.seconds, self.mebibytes = stack, seconds, mebibytes

    def chunks(self):
        if callable(self.content):
            yield from self.content()
        else:
            yield self.content if isinstance(self.content, bytes) else self.content.encode()

    def write(self, path):
        with open(path, "wb") as file:
            for chunk in self.chunks():
                file.write(chunk)


def refused(name, content, place, code, *words, **more):
    return Case(name, content, 1, words, place, code, **more)


def between(opening, chunk, times, closing):
    """A content of one chunk many times between two texts."""
    def chunks():
        yield opening.encode()
        at_once = max(1, MIB // len(chunk))
        for _ in range(times // at_once):
            yield chunk.encode() * at_once
        yield chunk.encode() * (times % at_once)
        yield closing.encode()
    return chunks


def variable(name, outcomes=("a", "b"), attributes=""):
    return "<VARIABLE%s><NAME>%s</NAME>%s</VARIABLE>\n" % (attributes, name,
                                                           "".join("<OUTCOME>%s</OUTCOME>" % o for o in outcomes))


def definition(child, parents=(), table=None):
    return "<DEFINITION><FOR>%s</FOR>%s%s</DEFINITION>\n" % (child, "".join("<GIVEN>%s</GIVEN>" % p for p in parents),
                                                             "" if table is None else "<TABLE>%s</TABLE>" % table)


def network(*parts):
    return HEAD + "".join(parts) + TAIL


def table(numbers):
    return network(COIN, definition("coin", table=numbers))


def packed(size):
    held = io.BytesIO()
    with gzip.GzipFile(fileobj=held, mode="wb", mtime=0) as file:
        for _ in range(size // MIB or 1):
            file.write(b" " * min(size, MIB))
    return held.getvalue()


def nested_entities(where):
    lines = ['<!ENTITY a0 "lol">'] + ['<!ENTITY a%d "%s">' % (i, "&a%d;" % (i - 1) * 10) for i in range(1, 10)]
    return '<!DOCTYPE BIF [\n%s\n]>\n<BIF VERSION="0.3"%s</BIF>' % ("\n".join(lines), where)


def flat_entity(where):
    return '<!DOCTYPE BIF [\n<!ENTITY a "%s">\n]>\n<BIF VERSION="0.3"%s</BIF>' % ("x" * 60000, where % ("&a;" * 33000))


def defaulted(n_attributes, n_elements):
    declared = "".join(' a%d CDATA ""\n' % i for i in range(n_attributes))
    rest = SOUND[SOUND.index("<BIF"):].replace("<NETWORK>", "<NETWORK>" + "<x/>" * n_elements)
    return "<!DOCTYPE BIF [<!ATTLIST x%s>]>\n" % declared + rest


def xml_cases():
    yield Case("sound", SOUND, header="coin")
    yield refused("nothing", b"", "1:1", "empty-file", "expected a network in the root element <BIF>")
    yield refused("cut inside a tag", HEAD + "<VARIABLE", "4:10", "truncated-xml", "inside a tag",
                  "<NETWORK> of line 3 is still open")
    yield refused("cut inside text", HEAD + "<VARIABLE>\n<NAME>co", "5:9", "truncated-xml",
                  "<NAME> of line 5 is still open")
    yield refused("cut inside a comment", HEAD + "<!-- x\n", "5:1", "truncated-xml", "inside a comment",
                  "<NETWORK> of line 3")
    yield refused("cut inside character data", HEAD + "<NAME><![CDATA[x", "4:17", "truncated-xml",
                  "inside a CDATA section", "<NAME> of line 4")
    yield refused("wrong end tag", HEAD + "<VARIABLE>\n</NETWORK></BIF>", "5:1", "mismatched-tag",
                  "</NETWORK> does not end <VARIABLE>, which began on line 4")
    yield refused("gzip bomb", packed(60 * MIB), "1:1", "not-xml", "gzip data", "decompress it first", seconds=0.2,
                  mebibytes=32)
    yield refused("small gzip", gzip.compress(SOUND.encode(), mtime=0), "1:1", "not-xml", "gzip data",
                  "decompress it first")
    yield Case("comments, instructions and character data",
               network("<!-- a --><?b c?>", variable("c<![CDATA[oi]]>n<!-- - -->s"), "<!-- -->"), header="coins")


def encoding_cases():
    declared = '<?xml version="1.0" encoding="%s"?>\n' + SOUND[SOUND.index("<BIF"):].replace("coin", "m\u00fcnze")
    for name, mark in (("UTF-16LE", b"\xff\xfe"), ("UTF-16BE", b"\xfe\xff"), ("UTF-32LE", b"\xff\xfe\0\0"),
                       ("UTF-32BE", b"\0\0\xfe\xff")):
        for with_mark in (True, False):
            yield refused("%s %s mark" % (name, "with a" if with_mark else "without"),
                          (mark if with_mark else b"") + SOUND.encode(name), "1:1",
                          "encoding", name + " text", "save it as UTF-8", "iconv -f " + name)
    yield refused("labelled UTF-16, and not", declared % "UTF-16", "1:1", "encoding", "UTF-16", "save it as UTF-8")
    yield refused("unknown label", declared % "x-unheard-of", "1:1", "encoding", "x-unheard-of", "save it as UTF-8")
    yield refused("a label for the shell", declared % "a;reboot", "1:1", "encoding", '"a;reboot"', "save it as UTF-8")
    hidden = "+ADw-+ACE-ENTITY a SYSTEM +ACI-file:///etc/hostname+ACI-+AD4-"
    yield refused("an entity hidden in UTF-7",
                  '<?xml version="1.0" encoding="UTF-7"?>\n<!DOCTYPE BIF [%s]>\n<BIF/>' % hidden, "1:1", "encoding",
                  "UTF-7", "save it as UTF-8", sealed=True)
    yield refused("a Latin-1 byte", network(variable("m\u00fcnze")).encode("latin-1"), "4:18", "bad-encoding",
                  "byte 0xFC is not UTF-8")
    yield Case("Latin-1 as declared", (declared % "ISO-8859-1").encode("latin-1"), header="m\u00fcnze")
    yield Case("windows-1252 as declared", (declared % "windows-1252").encode("cp1252"), header="m\u00fcnze")
    yield Case("UTF-8 with a mark", b"\xef\xbb\xbf" + (declared % "utf-8").encode(), header="m\u00fcnze")
    for name, bad, told in (("NUL", b"\0", "U+0000"), ("a control character", b"\x01", "U+0001"),
                            ("no character", b"\xef\xbf\xbe", "U+FFFE"),
                            ("surrogates", b"\xed\xa0\xbd\xed\xb8\x80", "byte 0xED"), ("an overlong form", b"\xc0\xaf",
                                                                                       "byte 0xC0")):
        yield refused(name, HEAD.encode() + b"<NAME>x" + bad + b"</NAME>" + (COIN + TAIL).encode(), "4:8",
                      "forbidden-character" if "U+" in told else "bad-encoding", told)
    yield refused("a reference to NUL", network("<NAME>x&#0;</NAME>", COIN), "4:8", "bad-xml",
                  "a character that XML does not allow")


def entity_cases():
    yield refused("nested entities in text", nested_entities("><NETWORK><NAME>&a9;</NAME></NETWORK>"), "2:1",
                  "entity-declaration", NO_ENTITIES)
    yield refused("nested entities in an attribute", nested_entities(" x='&a9;'>"), "2:1", "entity-declaration",
                  NO_ENTITIES)
    yield refused("a flat entity in text", flat_entity("><NETWORK><NAME>%s</NAME></NETWORK>"), "2:1",
                  "entity-declaration", NO_ENTITIES)
    yield refused("a flat entity in an attribute", flat_entity(" x='%s'>"), "2:1", "entity-declaration", NO_ENTITIES)
    yield refused("an entity of a file", '<!DOCTYPE BIF [<!ENTITY a SYSTEM "file:///etc/hostname">]>\n<BIF>&a;</BIF>',
                  "1:16", "entity-declaration",
                  NO_ENTITIES, sealed=True)
    yield refused("a parameter entity", '<!DOCTYPE BIF [<!ENTITY % a SYSTEM "file:///etc/hostname"> %a;]>\n<BIF/>',
                  "1:16", "entity-declaration",
                  NO_ENTITIES, sealed=True)
    yield refused("a parameter reference", "<!DOCTYPE BIF [ %a; ]>\n<BIF/>", "1:17", "entity-declaration",
                  "parameter references are not accepted")
    yield refused("a notation", '<!DOCTYPE BIF [ <!NOTATION a SYSTEM "b"> ]>\n<BIF/>', "1:17", "entity-declaration",
                  "notation declarations")
    yield refused("an entity that nothing declares", network("<NAME>&a;</NAME>", COIN), "4:7", "bad-xml",
                  "write the character itself")
    rest = SOUND[SOUND.index("<BIF"):]
    for url in ("file:///etc/hostname", "http://localhost:9/x.dtd", "ftp://localhost:9/x.dtd"):
        yield Case("document type at " + url, '<!DOCTYPE BIF SYSTEM "%s">\n' % url + rest, words=["1:15", "not opened"],
                   warned=["external-dtd"], sealed=True)
    plain = "<!ELEMENT BIF (NETWORK)*>\n<!ATTLIST VARIABLE TYPE (nature|decision|utility) \"nature\">\n<!ATTLIST BIF VERSION CDATA #REQUIRED>"
    yield Case("the usual document type", "<!DOCTYPE BIF [\n%s\n]>\n" % plain + rest, header="coin")
    yield Case("a default value", "<!DOCTYPE BIF [\n<!ATTLIST VARIABLE TYPE CDATA 'utility'>]>\n" + rest,
               words=["2:20", 'value "utility" of attribute TYPE of VARIABLE'],
               warned=["default-attribute"])
    yield Case("2,000 default values for 20,000 elements", defaulted(2000, 20000),
               words=["and 1990 more of [default-attribute]"],
               warned=["default-attribute", "further-warnings", "unknown-element"], seconds=0.6)


def limit_cases():
    room = 65536 - len("<!ELEMENT BIF (NETWORK)*>")
    for more in (0, 1):
        text = "<!DOCTYPE BIF [<!ELEMENT BIF (NETWORK)*>%s]>\n" % (" " * (room + more)) + SOUND[SOUND.index("<BIF"):]
        yield refused("a document type too long", text, "1:16", "xml-limit",
                      "longer than 65536 bytes") if more else Case("a long document type", text)
    yield refused("200,000 attributes", between(HEAD + "<x", ' abcdef="%d"', 200000, "/>" + TAIL), "4:1", "xml-limit",
                  "more than 256 attributes")
    many = "<x " + " ".join('xmlns:a%d="u"' % i for i in range(20000)) + "/>"
    yield refused("20,000 namespaces", HEAD + many + TAIL, "4:%d" % (many.index("xmlns:a256") + 1), "xml-limit",
                  "more than 256 namespace")
    few = "".join("<x %s/>" % " ".join('xmlns:a%d="u"' % i for i in range(50 * j, 50 * j + 50)) for j in range(400))
    yield refused("20,000 namespaces in many tags", HEAD + few + TAIL, "4:%d" % (few.index("xmlns:a256") + 1),
                  "xml-limit", "more than 256 namespace",
                  warned=["unknown-element"])
    yield refused("a long name", HEAD + "<" + "n" * 60000 + "/>" + TAIL, "4:2", "xml-limit", "longer than 255 bytes")
    yield refused("a long tag", HEAD + "<x" + " " * 70000 + "/>" + TAIL, "4:1", "xml-limit",
                  "a tag longer than 65536 bytes")
    names = "".join("<n%x/>" % i for i in range(900000))
    yield refused("900,000 names", HEAD + names + TAIL, "4:%d" % (names.index("<n%x/>" % (1000 - 3)) + 2), "xml-limit",
                  "more than 1000 different names",
                  warned=["further-warnings", "unknown-element"])
    for depth in (256, 257, 100000):
        inner = depth - 2
        text = HEAD + "<x>" * inner + "</x>" * inner + COIN + TAIL
        if depth == 256:
            yield Case("the greatest depth", text, warned=["unknown-element"], header=None)
            yield Case("the greatest depth on a small stack", text, warned=["unknown-element"], stack=64)
        else:
            yield refused("depth %d" % depth, text, "4:%d" % (3 * 254 + 1), "xml-limit", "more than 256 deep",
                          warned=["unknown-element"], stack=64)
    elements = SOUND.count("<") - SOUND.count("</") - 1
    yield Case("1,000,000 elements", between(HEAD, "<x/>", 1000000 - elements, SOUND[len(HEAD):]),
               warned=["unknown-element"])
    yield refused("1,000,001 elements", between(HEAD, "<x/>", 1000001 - elements, SOUND[len(HEAD):]), "5:28",
                  "xml-limit", "more than 1000000 elements",
                  warned=["unknown-element"])
    yield refused("15,000,000 elements", between(HEAD, "<x/>", 15000000, TAIL), "4:%d" % (4 * (1000000 - 2) + 1),
                  "xml-limit",
                  "more than 1000000 elements", warned=["unknown-element"])
    long = 11000000
    yield refused("a long text", between(HEAD + "<NAME>", "x", long, "</NAME>" + TAIL), "4:1", "xml-limit",
                  "neither TABLE nor PROPERTY")
    yield refused("a long text nobody reads", between(HEAD + "<x>", "x", long, "</x>" + TAIL), "3:1", "xml-limit",
                  "neither TABLE nor PROPERTY",
                  warned=["unknown-element"])
    yield refused("a long attribute", between(HEAD + '<x a="', "x", long, '"/>' + TAIL), "4:1", "xml-limit",
                  "a tag longer than 65536 bytes")
    yield refused("a long comment", between(HEAD + "<!--", "x", long, "-->" + TAIL), "4:1", "xml-limit",
                  "a comment longer than 65536 bytes")
    yield refused("a long instruction", between(HEAD + "<?x ", "x", long, "?>" + TAIL), "4:1", "xml-limit",
                  "a processing instruction longer than")
    yield Case("a long property", between(HEAD + COIN + "<PROPERTY>", "x", 30000000, "</PROPERTY>" + TAIL))
    yield Case("a long table", between(HEAD + COIN + "<DEFINITION><FOR>coin</FOR><TABLE>0.5", " ", 30000000,
                                       "0.5</TABLE></DEFINITION>" + TAIL),
               header="coin")
    yield refused("numbers without an end", between(HEAD + COIN + "<DEFINITION><FOR>coin</FOR><TABLE>", "0 ", 5000000,
                                                    "</TABLE></DEFINITION>" + TAIL),
                  "5:28", "too-many-cells", "more than 4194304 numbers", "raise --max-cells")


def outside_cases():
    rest = SOUND[SOUND.index("<BIF"):]
    include = rest.replace("<NETWORK>",
                           '<NETWORK><xi:include xmlns:xi="http://www.w3.org/2001/XInclude" href="file:///etc/hostname" parse="text"/>')
    yield Case("an inclusion", include, words=["<include>"], warned=["unknown-element"], sealed=True)
    for name, text in (("a style sheet", "<?xml-stylesheet href='file:///etc/hostname' type='text/xsl'?>"),
                       ("a catalogue", "<?oasis-xml-catalog catalog='file:///etc/hostname'?>")):
        yield Case(name, text + rest, sealed=True)
        yield Case(name + " inside", rest.replace("<NETWORK>", "<NETWORK>" + text), sealed=True)
    yield Case("a base", rest.replace("<NETWORK>", "<NETWORK xml:base='http://localhost:9/'>"), sealed=True)
    yield Case("a catalogue in the environment", '<!DOCTYPE BIF PUBLIC "-//X//Y" "http://localhost:9/x.dtd">\n' + rest,
               warned=["external-dtd"], sealed=True,
               environment={"XML_CATALOG_FILES": "/no/such/catalogue file:///etc/hostname"})


def place_cases():
    for name, end in (("LF", "\n"), ("CR LF", "\r\n"), ("CR", "\r")):
        lines = HEAD.replace("\n", end) + end * (70001 - 4)
        yield refused("line 70,001 behind %s" % name, lines + " <VARIABLE><NAME/>", "70001:12", "empty-name",
                      "an empty NAME")
        yield refused("line 70,001 behind %s, not well formed" % name, lines + " <VARIABLE></x>", "70001:12",
                      "mismatched-tag", "began on line 70001")
    for root, text in (("html", "<!DOCTYPE html>\n<html><body><p>x<br></body></html>"),
                       ("svg", '\n<svg xmlns="http://www.w3.org/2000/svg"/>'),
                       ("Workbook", '\n<Workbook xmlns="urn:schemas-microsoft-com:office:spreadsheet"/>')):
        yield refused("a file of <%s>" % root, text, "2:1", "wrong-root",
                      "the root element is <%s>; expected <BIF>" % root, "0.3")
    yield refused("another version", SOUND.replace("0.3", "0.5"), "2:1", "format-version", '"0.5"', "use 0.3")
    yield Case("no version", SOUND.replace(' VERSION="0.3"', ""), warned=["no-version"], header="coin")
    yield refused("two roots", SOUND + SOUND[SOUND.index("<BIF"):], "8:1", "second-root", "the first ended on line 7")
    yield refused("junk behind the end", SOUND + "junk", "8:1", "misplaced-text", "ends on line 7")
    yield refused("text before the declaration", "x" + SOUND, "1:1", "not-xml", "where <BIF> is expected")
    yield refused("a line before the declaration", "\n" + SOUND, "2:1", "misplaced-xml-declaration",
                  "first thing in the file")
    yield Case("XML 1.1", SOUND.replace('version="1.0"', 'version="1.1"'), words=["1:1"], warned=["xml-version"],
               header="coin")
    yield refused("XML 2.0", SOUND.replace('version="1.0"', 'version="2.0"'), "1:1", "xml-version", "use 1.0")


def network_cases():
    yield refused("a variable twice", network(COIN, COIN), "5:11", "duplicate-variable", "first on line 4")
    yield refused("an outcome twice", network(variable("a", ("b", "c", "b"))), "4:65", "duplicate-outcome",
                  "first on line 4")
    yield refused("an empty name", network(variable(" ")), "4:11", "empty-name", "write the name into it")
    yield refused("a name too long", network(variable("n" * 256)), "4:11", "long-name", "256 bytes; use at most 255")
    yield Case("the longest name", network(variable("n" * 255)))
    many = variable("a", ("\n%d" % i for i in range(70000)))
    yield refused("70,000 outcomes", network(many), "%d:%d" % (4 + 65534, len("65533</OUTCOME>") + 1),
                  "too-many-outcomes", "at most 65534")
    yield refused("a definition of no variable", network(COIN, definition("cion")), "5:13", "unknown-variable",
                  'did you mean "coin"?')
    yield refused("an unknown parent", network(COIN, definition("coin", ["Coin"])), "5:28", "unknown-parent",
                  'did you mean "coin"?')
    yield refused("two definitions", network(COIN, definition("coin"), definition("coin")), "6:1",
                  "duplicate-definition", "the first on line 5")
    yield Case("a structure alone", network(COIN, variable("b"), definition("b", ["coin"])))
    yield refused("a cycle of one", network(COIN, definition("coin", ["coin"])), "5:28", "cycle", "coin -> coin")
    yield refused("a cycle of two", network(COIN, variable("b"), definition("b", ["coin"]), definition("coin", ["b"])),
                  "6:1", "cycle", "b -> coin -> b")
    ring = "".join(variable("v%d" % i) for i in range(1000))
    ring += "".join(definition("v%d" % i, ["v%d" % ((i + 1) % 1000)]) for i in range(1000))
    yield refused("a cycle of 1,000", network(ring), None, "cycle", " -> ", "1000 arcs")
    yield refused("a table too short", network(COIN, variable("b", "xyz"), definition("b", ["coin"], "1 0 0 1 0")),
                  "6:44", "table-size",
                  "has 5 numbers; expected 6 = 3 outcomes x 2 of coin")
    yield refused("a table too long", table("0.5 0.25 0.25"), "5:28", "table-size",
                  "has 3 numbers; expected 2 = 2 outcomes")
    for number, words in (("-0.1", "negative"), ("1.5", "more than 1"), ("nan", "decimal point"),
                          ("inf", "decimal point"), ("1e999", "too large"),
                          ("0x1p-1", "decimal point"), ("0,5", "use a decimal point"), (".5.",
                                                                                        "decimal point"), ("9" * 400,
                                                                                                           "too large"),
                          ("0." + "5" * 600, "too large or no decimal number")):
        yield refused("the number %.12s" % number, table("1\n %s" % number), "6:2", "bad-number", number[:12], words)
    yield refused("an empty table", table(""), "5:28", "table-size", "has 0 numbers")
    yield Case("a row that sums to 0.999", table("0.5 0.499"), words=["5:35", "sums to 0.999"],
               warned=["row-renormalised"])
    yield refused("a row that sums to 0.97", table("0.5 0.47"), "5:35", "row-sum", "sums to 0.97, not to 1")
    yield refused("a row that sums to 0", table("0 0"), "5:35", "row-sum", "sums to 0, not to 1")
    yield Case("a row that sums to 1 + 1e-9", table("0.5 0.500000001"), header="coin")
    slowest = network(COIN, variable("b", "xyz"), definition("b", ["coin"], "0.1 0.2 0.3 0.4 0.6 0.4"))
    yield refused("the other order", slowest, "6:51", "row-sum", "row coin=heads of b", "--table-order for-slowest")
    for parents, outcomes in ((40, 10), (32, 4)):
        wide = "".join(variable("p%d" % i, range(outcomes)) for i in range(parents))
        yield refused("%d parents of %d outcomes" % (parents, outcomes),
                      network(COIN, wide, definition("coin", ("p%d" % i for i in range(parents)), "1 0")),
                      "%d:1" % (5 + parents), "too-many-cells", "--max-cells", mebibytes=32)


def name_cases():
    for name in ("<script>alert(1)</script>", '"]]>', "a--b", "=1+1", "\U0001f469\u200d\U0001f52c" * 17, "e\u0301",
                 "\u05d0\u05d1", "'; --", "${x}", "a\u00a0b"):
        escaped = name.replace("&", "&amp;").replace("<", "&lt;").replace(">", "&gt;")
        yield Case("the name %s" % ascii(name)[:24], network(variable(escaped), definition(escaped, (), "1 0")),
                   header=name)
    for name, told in (("a\u202eb", "U+202E"), ("a\nb", "U+000A"), ("a&#9;b", "U+0009"), ("a\x7fb", "U+007F"),
                       ("a\u0085b", "U+0085")):
        yield refused("the control character %s" % told, network(variable(name)), "4:11", "control-character", told)
    yield refused("an escape character", network(variable("a\x1b[31mb")), "4:18", "forbidden-character", "U+001B")


def random_cases():
    chance = random.Random(20)
    for i in range(40):
        yield Case("random bytes %d" % i, bytes(chance.randrange(256) for _ in range(chance.randrange(1, 400))),
                   exit=None)
    for i in range(120):
        flipped = bytearray(SOUND.encode())
        flipped[chance.randrange(len(flipped))] ^= 1 << chance.randrange(8)
        yield Case("a flipped bit %d" % i, bytes(flipped), exit=None)


def cases():
    for group in (xml_cases, encoding_cases, entity_cases, limit_cases, outside_cases, place_cases, network_cases,
                  name_cases, random_cases):
        yield from group()


def main():
    manifest = []
    for number, case in enumerate(cases()):
        file = "%03d.xml" % number
        case.write(os.path.join(sys.argv[1], file))
        manifest.append({"file": file, "name": case.name, "exit": case.exit, "place": case.place, "code": case.code,
                         "words": case.words,
                         "warned": case.warned})
    with open(os.path.join(sys.argv[1], "manifest.json"), "w", encoding="utf-8") as out:
        json.dump(manifest, out, indent=1)


if __name__ == "__main__":
    main()
