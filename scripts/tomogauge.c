#include "io/command.h"

int main(int argc, char **argv)
{
    static const tg_command *const commands[] = {NULL};
    return tg_program(commands, argc, argv);
}
