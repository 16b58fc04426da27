#include "io/process.h"

#include <gsl/gsl_errno.h>
#include <locale.h>

void tg_process_start(void)
{
    gsl_set_error_handler_off();
    setlocale(LC_NUMERIC, "C");
}
