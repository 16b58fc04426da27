#include "io/error.h"

#include <stdarg.h>
#include <stdio.h>

__attribute__((format(printf, 5, 0))) static void add(tg_error *e, bool warning, const char *file, int line,
                                                      const char *format, va_list args)
{
    if (e->count < TG_MESSAGES) {
        tg_message *m = &e->message[e->count];
        snprintf(m->file, sizeof m->file, "%s", file ? file : "");
        m->line = line;
        m->warning = warning;
        vsnprintf(m->what, sizeof m->what, format, args);
    }
    e->count++;
}

tg_code tg_fail(tg_error *e, tg_code code, const char *file, int line, const char *format, ...)
{
    if (!e) return code;
    va_list args;
    va_start(args, format);
    add(e, false, file, line, format, args);
    va_end(args);
    if (e->code == TG_OK) e->code = code;
    return code;
}

void tg_hand_on(const tg_error *from, const char *file, tg_error *to)
{
    for (size_t i = 0; i < from->count && i < TG_MESSAGES; i++) {
        const tg_message *m = &from->message[i];
        const char *where = m->file[0] ? m->file : file;
        if (m->warning)
            tg_warn(to, where, m->line, "%s", m->what);
        else
            tg_fail(to, from->code, where, m->line, "%s", m->what);
    }
}

void tg_note(tg_code *code, tg_code found)
{
    if (*code == TG_OK || found == TG_MACHINE) *code = found;
}

void tg_warn(tg_error *e, const char *file, int line, const char *format, ...)
{
    if (!e) return;
    va_list args;
    va_start(args, format);
    add(e, true, file, line, format, args);
    va_end(args);
}
