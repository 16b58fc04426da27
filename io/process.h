#ifndef TG_PROCESS_H
#define TG_PROCESS_H

/** The few settings that belong to the whole process; a program that uses the library calls it once, first:
 *  GSL answers errors by return code instead of aborting, and numbers have a decimal point. */
void tg_process_start(void);

#endif
