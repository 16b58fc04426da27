#ifndef TG_PAGE_H
#define TG_PAGE_H
#include "metrics/evaluate.h"

/** The report of an evaluation as one self-contained HTML file: verdict, table, pictures with regions, curves,
 * conditions, lines to sign. Verdict and tables are plain HTML; the script only adds charts. It needs no network.
 *  @param html  set on success, tg_free */
tg_code tg_page_report(const tg_evaluation *ev, char **html, tg_error *e);

#endif
