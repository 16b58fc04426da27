#include "io/command.h"

int main(int argc, char **argv)
{
    static const tg_command *const commands[] = {&tg_simulate_command, &tg_reconstruct_command, &tg_measure_command,
                                                 &tg_evaluate_command, &tg_show_command,        NULL};
    return tg_program(commands, argc, argv);
}
