#ifndef TG_PROCESS_H
#define TG_PROCESS_H

/** The few settings that belong to the whole process; a program that uses the library calls it once, first:
 *  GSL reports errors by return code instead of aborting, numbers are written with a decimal point, xraylib is loaded.
 */
void tg_process_start(void);

#endif
