#include "report/whole.h"

void whole_head(const char *job, size_t length, struct buffer *out)
{
    while (length > 0 && (job[length - 1] == '\n' || job[length - 1] == '\r'))
        length--;
    buffer_text(out, "[\n");
    buffer_add(out, job, length);
}

void whole_tail(const struct dossier *dossier, struct buffer *out)
{
    buffer_format(out, ",\n{\"kind\":\"end\",\"records\":%zu}\n]\n", dossier->lines.count + 1);
}
