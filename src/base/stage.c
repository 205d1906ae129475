#include "base/stage.h"

#include "base/message.h"
#include "base/status.h"

int stage_run(const struct usage *usage, int argc, char **argv,
              int (*loop)(const struct option_list *files))
{
    struct option_list files = {0};
    int status = STATUS_USAGE;

    message_stage(usage->stage);
    switch (options_parse(usage, argc, argv, &files)) {
    case OPTIONS_STOP:
        status = STATUS_DONE;
        break;
    case OPTIONS_GO:
        status = loop(&files);
        break;
    case OPTIONS_MISUSE:
        break;
    }
    option_list_release(&files);
    return status;
}
