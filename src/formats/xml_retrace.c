/* An element's text once more, byte by byte: only asked for when something in it has to be pointed at, so that the
 * parse itself need not keep the place of every number. */
#include "formats/xml.h"

#include <stdlib.h>
#include <string.h>

static bool begins(const bali_xml_retrace *retrace, const char *what) {
    return strncmp(retrace->text + retrace->at, what, strlen(what)) == 0;
}

static void skip_past(bali_xml_retrace *retrace, const char *what) {
    const char *found = strstr(retrace->text + retrace->at, what);
    retrace->at = found ? (size_t)(found - retrace->text) + strlen(what)
                        : retrace->at + strlen(retrace->text + retrace->at);
}

/* Comments, instructions and the marks around CDATA are no text. */
static void skip_markup(bali_xml_retrace *retrace) {
    for (;;) {
        if (retrace->in_cdata) {
            if (!begins(retrace, "]]>")) return;
            retrace->at += 3;
            retrace->in_cdata = false;
        } else if (begins(retrace, "<!--")) {
            skip_past(retrace, "-->");
        } else if (begins(retrace, "<?")) {
            skip_past(retrace, "?>");
        } else if (begins(retrace, "<![CDATA[")) {
            retrace->at += 9;
            retrace->in_cdata = true;
        } else {
            return;
        }
    }
}

static char referred(const char *reference) {
    if (reference[1] != '#') return '&';
    bool hexadecimal = reference[2] == 'x';
    long code = strtol(reference + (hexadecimal ? 3 : 2), NULL, hexadecimal ? 16 : 10);
    return code == ' ' || code == '\t' || code == '\n' || code == '\r' ? ' ' : '&';
}

bool bali_xml_retrace_next(bali_xml_retrace *retrace, char *byte, size_t *at) {
    skip_markup(retrace);
    const char *here = retrace->text + retrace->at;
    if (*here == '\0' || (*here == '<' && !retrace->in_cdata)) return false;
    *at = retrace->at;
    if (*here == '&' && !retrace->in_cdata) {
        *byte = referred(here);
        skip_past(retrace, ";");
    } else {
        *byte = *here;
        retrace->at++;
    }
    return true;
}
