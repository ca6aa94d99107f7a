"""Bad and odd tables, and what has to come of each: made by code, so that nothing large has to be kept.

A case says what to write, with which options to read it, and what has to come back: the exit status, words of the messages,
where the first refusal points and its code. test_hostile_tables.py runs them.
"""
import gzip
import io
import itertools
import zipfile
import zlib

CLINIC = {"smoker": ["no", "yes"], "stage": ["1", "2", "1-2"], "place": ["home", "ward", "café"]}
HEADER = "smoker,stage,place\n"
PLAIN = HEADER + "no,1,home\nyes,2,ward\nno,1-2,café\n"
SIGNS = {"=sum": ["=1+1", "-1"], "@who": ["+me", "@you"]}
RARE = {"smoker": ["no", "yes", "NA"], "flag": ["true", "false"]}
WIDE = {"c%d" % i: ["0", "1"] for i in (0, 7, 99999)}
MEBIBYTE = 1 << 20


class Case:
    def __init__(self, name, content, exit=0, words=(), place=None, code=None, options=(), variables=None, command="check",
                 same_as=None, seconds=1.0, mebibytes=256, file_name="table.csv", absent=(), most_read=None):
        """content: text, bytes, or a function that gives chunks of bytes one after another (then written as they come).
        place: "LINE:COLUMN" or "LINE" of the first refusal.  same_as: the page has to equal that of another case.
        absent: words that no message may show.  most_read: the content is piped in, and at most this many bytes may be taken."""
        self.name, self.content, self.exit, self.words, self.place, self.code = name, content, exit, words, place, code
        self.options, self.variables, self.command, self.same_as = list(options), variables or CLINIC, command, same_as
        self.seconds, self.mebibytes, self.file_name, self.absent, self.most_read = seconds, mebibytes, file_name, absent, most_read

    def chunks(self):
        if callable(self.content):
            yield from self.content()
        else:
            yield self.content if isinstance(self.content, bytes) else self.content.encode()


def repeat(chunk, times=None):
    """A content of one chunk many times, or without an end."""
    return lambda: itertools.repeat(chunk) if times is None else itertools.repeat(chunk, times)


def first(text, then):
    """A content that begins with a text."""
    return lambda: itertools.chain([text.encode()], then())


def zipped():
    held = io.BytesIO()
    with zipfile.ZipFile(held, "w") as archive:
        archive.writestr("xl/worksheets/sheet1.xml", "<worksheet/>")
    return held.getvalue()


def gzip_bomb():
    held = io.BytesIO()
    with gzip.GzipFile(fileobj=held, mode="wb", mtime=0) as file:
        file.write(HEADER.encode())
        for _ in range(64):
            file.write(b"no,1,home\n" * 100000)
    return held.getvalue()


def gzip_zeros():
    """Nothing but one label for ever, as a gzip file that grows a thousandfold: made by zlib as it is asked for."""
    packer = zlib.compressobj(9, zlib.DEFLATED, 31)
    yield packer.compress(HEADER.encode())
    while True:
        yield packer.compress(b"no,1,home\n" * 100000)


def weighted(*weights):
    """The plain table's first record once for each weight."""
    return "weight," + HEADER + "".join("%s,no,1,home\n" % weight for weight in weights)


def counted_columns(n, width=0):
    """A header of n columns c0, c1, ... and a record of zeros; width pads the cells of columns that nobody wants."""
    def chunks():
        for begin in range(0, n, 10000):
            yield ",".join("c%d" % i for i in range(begin, min(begin + 10000, n))).encode() + (b"," if begin + 10000 < n else b"\n")
        pad = "x" * width
        for begin in range(0, n, 10000):
            cells = ("0" if "c%d" % i in WIDE else pad for i in range(begin, min(begin + 10000, n)))
            yield ",".join(cells).encode() + (b"," if begin + 10000 < n else b"\n")
    return chunks


def endless_columns():
    for begin in itertools.count(0, 10000):
        yield ",".join("c%d" % i for i in range(begin, begin + 10000)).encode() + b","


def good():
    """Tables that are read, whatever they look like."""
    lines = PLAIN.split("\n")
    yield Case("plain", PLAIN)
    yield Case("header alone", HEADER, words=["no records", "[no-records]"])
    yield Case("header without a newline", HEADER.strip(), words=["no records", "[no-records]"])
    yield Case("byte order mark", b"\xef\xbb\xbf" + PLAIN.encode(), same_as="plain")
    yield Case("byte order mark before a quoted header", b"\xef\xbb\xbf" + PLAIN.replace("smoker", '"smoker"').encode(), same_as="plain")
    yield Case("CRLF", PLAIN.replace("\n", "\r\n"), same_as="plain")
    yield Case("CR", PLAIN.replace("\n", "\r"), same_as="plain")
    yield Case("mixed line ends", "\r\n".join(lines[:2]) + "\r" + "\n".join(lines[2:]), same_as="plain")
    yield Case("no final newline", PLAIN[:-1], same_as="plain")
    yield Case("trailing blank lines", PLAIN + "\n\r\n  \n", same_as="plain")
    yield Case("blanks around header and cells", PLAIN.replace("smoker", " smoker\t").replace(",2,", " , 2 ,"), same_as="plain",
               options=["--delimiter", ","])
    yield Case("all quoted", "\n".join(",".join('"%s"' % c for c in line.split(",")) for line in lines[:-1]) + "\n", same_as="plain")
    yield Case("gzip", gzip.compress(PLAIN.encode(), mtime=0), same_as="plain")
    yield Case("gzip in two members", gzip.compress(PLAIN[:30].encode()) + gzip.compress(PLAIN[30:].encode()), same_as="plain")
    yield Case("gzip with a name and a tab", gzip.compress(PLAIN.replace(",", "\t").encode()), same_as="plain", file_name="table.tsv.gz")
    yield Case("weights", weighted(2, "0.5", "1e3", 0), options=["--weight", "weight"])
    yield Case("semicolons asked for", PLAIN.replace(",", ";"), options=["--delimiter", ";"], same_as="plain")
    yield Case("tabs found in the header", PLAIN.replace(",", "\t"), same_as="plain")
    yield Case("tabs by the file's ending", "smoker\nno\nyes\n", variables={"smoker": ["no", "yes"]}, file_name="table.tsv")
    yield Case("columns in another order", "place,smoker,stage\nhome,no,1\nward,yes,2\ncafé,no,1-2\n", same_as="plain")
    yield Case("column that is no variable", "id," + "\n1,".join(lines[:-1]) + "\n",
               words=["1 column is not a variable and is ignored: id", "[ignored-columns]"], same_as="plain")
    yield Case("quotes, delimiters and newlines in a column nobody wants",
               'smoker,note,stage,place\nno,"a ""b"", c",1,home\nyes,"two\nlines",2,ward\nno,"\r\n",1-2,café\n', same_as="plain",
               words=["[ignored-columns]"])
    yield Case("labels that begin with a sign", "=sum,@who\n=1+1,+me\n-1,@you\n", variables=SIGNS)
    yield Case("an outcome NA", "smoker,flag\nNA,true\nno,false\n", variables=RARE, words=['"NA" is an outcome of smoker', "[outcome-not-missing]"])
    yield Case("missing spellings dropped", HEADER + "no,?,home\nno,,home\nNA,1,ward\n\"\",2,home\nyes,2,ward\nno,1,-9\n",
               options=["--missing", "drop", "--missing-label", "?", "--missing-label", "-9"])
    yield Case("every record lacks a cell", HEADER + "no,,home\n,1,home\n", options=["--missing", "drop"],
               words=["each of its 2 records has a missing cell", "[no-records]"])
    yield Case("one record", HEADER + "no,1,home\n")
    yield Case("constant column", HEADER + "no,1,home\nno,2,ward\n")
    yield Case("100,000 columns", counted_columns(100000), variables=WIDE, words=["99997 columns are not variables"])
    yield Case("one line of 20 MB", counted_columns(1000000, 18), variables=WIDE, words=["999997 columns are not variables"], seconds=3)
    yield Case("ten million records", first(HEADER, repeat(b"no,1,home\nyes,2,ward\n" * 50000, 100)), seconds=8)
    yield Case("a cell of one mebibyte", first(HEADER.replace("\n", ",note\nno,1,home,"), repeat(b"x" * MEBIBYTE, 1)),
               words=["[ignored-columns]"])


def headers():
    """Headers that are refused."""
    yield Case("empty file", "", 1, ["the file is empty"], "1:1", "no-header")
    yield Case("byte order mark alone", b"\xef\xbb\xbf", 1, ["the file is empty"], "1:1", "no-header")
    yield Case("blank first line", "\n" + PLAIN, 1, ["blank"], "1:1", "no-header")
    yield Case("duplicate column", "smoker,stage,place,smoker\n", 1, ["columns 1 and 4", '"smoker"'], "1:20", "duplicate-column")
    yield Case("column without a name", "smoker,,stage,place\n", 1, ["column 2"], "1:8", "empty-column")
    yield Case("trailing delimiter on all lines", "smoker,stage,place,\nno,1,home,\n", 1, ["column 4", "at the end of every line"],
               "1:20", "empty-column")
    yield Case("unexpected column", "id," + HEADER, 1, ['column 1, "id"', "--strict"], "1:1", "unexpected-column", ["--strict"])
    yield Case("column missing", "smoker,place\nno,home\n", 1, ["stage has no column"], "1", "missing-column")
    yield Case("column misspelt", "smokr,stage,place\n", 1, ["smoker has no column", 'did you mean column 1, "smokr"?'], "1",
               "missing-column")
    yield Case("column in another case", "Smoker,stage,place\n", 1, ["only in upper and lower case"], "1", "missing-column")
    yield Case("column with other blanks", '" smoker",stage,place\n', 1, ["only in blanks"], "1", "missing-column")
    yield Case("column in another normalisation", "cafe\u0301\nno\n", 1, ["only in Unicode normalisation"], "1", "missing-column",
               variables={"café": ["no", "yes"]})
    yield Case("no header at all", "no,1,home\nyes,2,ward\n", 1, ["is the first line a header"], "1", "missing-column")
    yield Case("comment before the header", "# invented\n" + PLAIN, 1, ['begins with "#"', "remove"], "1", "comment-line")
    yield Case("spreadsheet's sep line", "sep=;\n" + PLAIN.replace(",", ";"), 1, ["remove the line", "--delimiter"], "1:1", "sep-line")
    yield Case("semicolons", PLAIN.replace(",", ";"), 1, ["--delimiter ';'"], "1:1", "wrong-delimiter")
    yield Case("quoted semicolons", '"smoker";"stage";"place"\n"no";"1";"home"\n', 1, ["--delimiter ';'"], "1:1", "wrong-delimiter")
    yield Case("commas where tabs were asked for", PLAIN, 1, ["--delimiter ','"], "1:1", "wrong-delimiter", ["--delimiter", "\\t"])


def kinds():
    """Files that are no CSV in UTF-8."""
    for name, encoding in ("UTF-16 with a mark", "utf-16"), ("UTF-16LE", "utf-16-le"), ("UTF-16BE", "utf-16-be"), ("UTF-32", "utf-32"):
        yield Case(name, PLAIN.encode(encoding), 1, ["looks like UTF-", "iconv -f UTF-"], "1:1", "encoding")
    yield Case("PDF", b"%PDF-1.7\n%\xe2\xe3\xcf\xd3\n", 1, ["PDF"], "1:1", "not-a-table")
    yield Case("spreadsheet", zipped(), 1, ["spreadsheet", "CSV in UTF-8"], "1:1", "not-a-table")
    packed = gzip.compress(PLAIN.encode(), mtime=0)
    yield Case("gzip in gzip", gzip.compress(packed), 1, ["gzip data inside gzip data"], "1:1", "not-a-table")
    yield Case("gzip bomb", gzip_bomb(), 1, ["more than 200 times"], None, "gzip-ratio")
    yield Case("gzip bomb for ever", gzip_zeros, 1, ["more than 200 times"], None, "gzip-ratio", most_read=4 * MEBIBYTE)
    yield Case("gzip cut short", packed[:-9], 1, ["end too early", "at byte %d" % (len(packed) - 9)], None, "bad-gzip")
    yield Case("gzip cut in its header", packed[:5], 1, ["end too early"], None, "bad-gzip")
    yield Case("gzip with a wrong sum", packed[:-8] + b"\0\0\0\0" + packed[-4:], 1, ["damaged"], None, "bad-gzip")
    yield Case("gzip with more behind it", packed + b"no,1,home\n", 1, ["something else stands behind"], None, "bad-gzip")
    yield Case("gzip of a broken table", gzip.compress((PLAIN + "no,1\n").encode()), 1, ["found 2 cells"], "5", "ragged-record")
    for name, data, words in (
            ("Latin-1", b"no,1,caf\xe9\n", ["byte 0xE9", "iconv"]), ("overlong form", b"no,1,\xc0\xaf\n", ["bytes 0xC0 0xAF"]),
            ("surrogate", b"no,1,\xed\xa0\x80\n", ["0xED 0xA0 0x80"]), ("beyond U+10FFFF", b"no,1,\xf4\x90\x80\x80\n", ["0xF4 0x90 0x80 0x80"]),
            ("sequence cut at the end", b"no,1,\xe2\x82", ["the file ends inside a character"])):
        yield Case(name, HEADER.encode() + data, 1, words, "2:%d" % (9 if name == "Latin-1" else 6), "bad-utf8")
    yield Case("Latin-1 in a column nobody wants", HEADER.encode().replace(b"\n", b",note\n") + b"no,1,home,\xe9\n", 1,
               ["in column note"], "2:11", "bad-utf8")
    yield Case("NUL", HEADER + "no,1,ho\0me\n", 1, ["NUL", "0x00"], "2:8", "control-character")
    yield Case("escape sequence", HEADER + "no,1,\x1b[31mhome\n", 1, ["U+001B"], "2:6", "control-character")


def structure():
    """Tables whose structure is broken: the reading stops there."""
    lines = PLAIN.encode()
    yield Case("blank line in the middle", PLAIN.replace("yes", "\nyes"), 1, ["blank line"], "3:1", "blank-line")
    yield Case("quote never closed", HEADER + 'no,1,"home\nyes,2,ward\n', 1, ["never closed"], "2:6", "unclosed-quote")
    yield Case("quote never closed, endless", first(HEADER + 'no,1,"', repeat(b"home\nyes,2,ward\n" * 5000)), 1,
               ["not closed within 1 MiB"], "2:6", "unclosed-quote", most_read=4 * MEBIBYTE)
    yield Case("quote at the end of the file", HEADER + 'no,1,"', 1, ["never closed"], "2:6", "unclosed-quote")
    yield Case("text behind a closing quote", HEADER + 'no,1,"ho"me\n', 1, ["double the quote"], "2:10", "misplaced-quote")
    yield Case("quote inside a cell", HEADER + 'no,1,ho"me\n', 1, ["double the quote"], "2:8", "misplaced-quote")
    yield Case("blank behind a closing quote", HEADER + 'no,"1" ,home\n', 1, ["remove the blank"], "2:7", "misplaced-quote")
    yield Case("blank before a quote", HEADER + 'no, "1",home\n', 1, ["remove the blanks"], "2:5", "misplaced-quote")
    yield Case("short record", PLAIN + "no,1\n", 1, ["found 2 cells, expected 3", "line 1"], "5", "ragged-record")
    yield Case("long record", PLAIN + "no,1,home,home\n", 1, ["found 4 cells, expected 3", "line 1"], "5:11", "ragged-record")
    yield Case("trailing delimiter on one line", PLAIN + "no,1,home,\n", 1, ["delimiter at the end"], "5:11", "ragged-record")
    yield Case("comment among the records", PLAIN + "# later cases\nno,1,home\n", 1, ["comment"], "5:1", "comment-line")
    yield Case("one cell of 20 MB", first(HEADER + "no,1,", repeat(b"x" * MEBIBYTE, 20)), 1, ["1 MiB"], "2:6", "cell-too-long")
    yield Case("wrong label, then a short record", HEADER + "maybe,1,home\nno\n", 1,
               ['"maybe" is not an outcome', "found 1 cell, expected 3"], "2:1", "unknown-label")


def cells():
    """Cells that are not right: gathered, and refused at the end."""
    yield Case("misspelt label", HEADER + "no,1,hoome\n", 1, ["not an outcome of place (home, ward, café)", 'did you mean "home"?'], "2:6",
               "unknown-label")
    yield Case("label in another case", HEADER + "No,1,home\n", 1, ['did you mean "no"?'], "2:1", "unknown-label")
    yield Case("1.0 for 1", HEADER + "no,1.0,home\n", 1, ['did you mean "1"?'], "2:4", "unknown-label")
    yield Case("a date made by a spreadsheet", HEADER + "no,02-Jan,home\n", 1, ['make a date of "1-2"?'], "2:4", "unknown-label")
    yield Case("a truth value made by a spreadsheet", "smoker,flag\nno,TRUE\n", 1, ['did you mean "true"?'], "2:4", "unknown-label",
               variables=RARE)
    yield Case("label in another normalisation", HEADER + "no,1,cafe\u0301\n", 1, ["only in Unicode normalisation"], "2:6", "unknown-label")
    yield Case("blanks inside quotes", HEADER + 'no,1," home"\n', 1, ["only in blanks"], "2:6", "unknown-label")
    yield Case("newline in a cell, then a wrong label", 'note,smoker,stage,place\n"two\nlines",no,1,home\nx,maybe,1,home\n', 1,
               ["in record 2"], "4:3", "unknown-label")
    for token in ("N/A", "?", ".", "NULL", "-9", "NaN"):
        yield Case("usual spelling %s of a missing cell" % token, HEADER + "no,%s,home\n" % token, 1, ['--missing-label "%s"' % token],
                   "2:4", "unknown-label")
    yield Case("missing cells", HEADER + "no,,home\nNA,2,home\n\"\",1,home\nyes,2,ward\n", 1,
               ["3 missing cells: 2 in smoker, 1 in stage", "drop would leave out 3 of 4 records"], "2:4", "missing-cells", command="fit")
    many = "".join("maybe,%s,home\n" % (3 if i % 2 else 1) for i in range(830)) + "no,1,hospital\n"
    yield Case("hundreds of wrong labels", HEADER + many, 1, ["and 1,236 more unknown labels in 3 columns"], "2:1", "unknown-label")
    yield Case("hundreds of missing cells", HEADER + "no,1,\n" * 1244, 1, ["1,244 missing cells: 1,244 in place"], "2:6", "missing-cells",
               command="fit")
    yield Case("header repeated", HEADER + "no,1,home\n" * 499 + HEADER + "no,1,home\n", 1, ["line 501 repeats the header"], "501:1",
               "repeated-header")
    yield Case("no cell's text is shown", HEADER + "no,1,Jane Doe\nJane Doe,1,home\n", 1, ["not an outcome of place"], "2:6",
               "unknown-label", ["--redact"], absent=["Jane", "Doe"])
    yield Case("no byte of a cell is shown", HEADER.encode() + b"no,1,J\xe4ne\n", 1, ["not UTF-8"], "2:7", "bad-utf8", ["--redact"],
               absent=["E4", "ne\\"])
    yield Case("a long wrong label is cut", first(HEADER + "no,1,", lambda: [b"lemon " * 50000, b"\n"]), 1, ["..."], "2:6", "unknown-label")


def weights():
    """Weights that are none, each placed, and tables in which nothing counts."""
    asked = ["--weight", "weight"]
    for cell in ("-1", "nan", "inf", "1e400", "1_000", "", '"1,5"', "1e16", "NA", "0x10", "1.000.000"):
        yield Case("weight %s" % (cell or "missing"), weighted(1, cell), 1, ["weight"], "3:1", "bad-weight", asked)
    yield Case("decimal comma in a weight", weighted('"1,5"'), 1, ["use a decimal point"], "2:1", "bad-weight", asked)
    yield Case("hundreds of bad weights", weighted(*["x"] * 300), 1, ["and 290 more bad weights"], "2:1", "bad-weight", asked)
    yield Case("all weights 0", weighted(0, 0, 0), 1, ["no record has a weight above 0"], None, "no-weight", asked)
    yield Case("weights beyond exact counts", weighted(*["1e15"] * 10), 1, ["2^53"], "11", "bad-weight", asked)
    yield Case("no such column of weights", weighted(1), 1, ['did you mean "weight"?'], "1", "missing-column", ["--weight", "weigth"])
    yield Case("no weight's text is shown", weighted("Jane"), 1, ["the text is not a weight"], "2:1", "bad-weight", asked + ["--redact"],
               absent=["Jane"])
    yield Case("header repeated with weights", weighted(1) + weighted(1), 1, ["line 3 repeats the header"], "3:1", "repeated-header", asked)


def endless():
    """Input without an end: piped in, and left as soon as something is wrong."""
    yield Case("zeros for ever", repeat(b"\0" * 65536), 1, ["NUL"], "1:1", "control-character", most_read=4 * MEBIBYTE)
    yield Case("one letter and a newline for ever", repeat(b"y\n" * 32768), 1, ["no column"], "1", "missing-column", most_read=4 * MEBIBYTE)
    yield Case("one letter for ever", repeat(b"y" * 65536), 1, ["1 MiB"], "1:1", "cell-too-long", most_read=4 * MEBIBYTE)
    yield Case("delimiters for ever", repeat(b"," * 65536), 1, ["no name"], "1:1", "empty-column", most_read=4 * MEBIBYTE)
    yield Case("columns for ever", endless_columns, 1, ["more than 1048576 columns"], "1:8326075", "too-many-columns", most_read=40 * MEBIBYTE,
               seconds=3)
    yield Case("a record without an end", first(HEADER + "no,1,home,", repeat(b"x," * 32768)), 1, ["cells or more, expected 3"], "2:11",
               "ragged-record", most_read=4 * MEBIBYTE)
    yield Case("blank lines for ever", first(PLAIN + "\nno,1,home\n", repeat(b"\n" * 65536)), 1, ["blank line"], "5:1", "blank-line",
               most_read=4 * MEBIBYTE)


def cases():
    return list(itertools.chain(good(), headers(), kinds(), structure(), cells(), weights(), endless()))
