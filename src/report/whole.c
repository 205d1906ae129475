#include "report/whole.h"

void whole_write(const struct dossier *dossier, const char *job, size_t length, struct buffer *out)
{
    while (length > 0 && (job[length - 1] == '\n' || job[length - 1] == '\r'))
        length--;
    buffer_text(out, "[\n");
    buffer_add(out, job, length);
    for (size_t i = 0; i < dossier->lines.count; i++) {
        const struct dossier_line *line = &dossier->lines.items[i];
        buffer_text(out, ",\n");
        buffer_add(out, dossier->text.bytes + line->at, line->length);
    }
    buffer_format(out, ",\n{\"kind\":\"end\",\"records\":%zu}\n]\n", dossier->lines.count + 1);
}
