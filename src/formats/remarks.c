#include "formats/remarks.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>

enum { TOLD = 10 };

static bali_remark_kind *kind_of(bali_remarks *remarks, const char *code) {
    for (size_t i = 0; i < remarks->n_kinds; i++)
        if (strcmp(remarks->kinds[i].code, code) == 0) return &remarks->kinds[i];
    if (remarks->n_kinds == sizeof remarks->kinds / sizeof remarks->kinds[0])
        return &remarks->kinds[remarks->n_kinds - 1];
    remarks->kinds[remarks->n_kinds] = (bali_remark_kind){code, 0};
    return &remarks->kinds[remarks->n_kinds++];
}

static void tell(const bali_remarks *remarks, bal_error *notice) {
    if (remarks->notices && remarks->notices->tell)
        remarks->notices->tell(remarks->notices->context, BAL_WARNING, notice);
}

bool bali_remarks_wanted(bali_remarks *remarks, const char *code) {
    bali_remark_kind *kind = kind_of(remarks, code);
    if (kind->n < TOLD) return true;
    kind->n++;
    return false;
}

void bali_remark(bali_remarks *remarks, size_t at, const char *code, const char *variable, const char *format, ...) {
    if (!bali_remarks_wanted(remarks, code)) return;
    kind_of(remarks, code)->n++;
    bal_error notice = {0};
    char message[sizeof notice.message];
    va_list arguments;
    va_start(arguments, format);
    if (vsnprintf(message, sizeof message, format, arguments) < 0) message[0] = '\0';
    va_end(arguments);
    (void)bal_error_set(&notice, BAL_OK, code, "%s", message);
    bali_xml_place(remarks->xml, at, &notice);
    bal_error_context(&notice, 0, variable);
    tell(remarks, &notice);
}

void bali_remarks_close(bali_remarks *remarks) {
    for (size_t i = 0; i < remarks->n_kinds; i++) {
        const bali_remark_kind *kind = &remarks->kinds[i];
        if (kind->n <= TOLD) continue;
        bal_error notice = {0};
        (void)bal_error_set(&notice, BAL_OK, "further-warnings", "and %zu more of [%s]", kind->n - TOLD, kind->code);
        bali_xml_place(remarks->xml, 0, &notice);
        notice.line = notice.column = 0;
        tell(remarks, &notice);
    }
}
