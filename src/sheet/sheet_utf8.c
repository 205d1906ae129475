#include "sheet/sheet_utf8.h"

/* The second byte's range of a well-formed sequence (RFC 3629, section 4). */
static void second_range(unsigned char first, unsigned char *low, unsigned char *high)
{
    *low = first == 0xe0 ? 0xa0 : first == 0xf0 ? 0x90 : 0x80;
    *high = first == 0xed ? 0x9f : first == 0xf4 ? 0x8f : 0xbf;
}

size_t sheet_utf8_length(const char *bytes, size_t length)
{
    const unsigned char *b = (const unsigned char *)bytes;
    if (length == 0)
        return 0;
    if (b[0] < 0x80)
        return 1;
    size_t size = b[0] >= 0xc2 && b[0] <= 0xdf   ? 2
                  : b[0] >= 0xe0 && b[0] <= 0xef ? 3
                  : b[0] >= 0xf0 && b[0] <= 0xf4 ? 4
                                                 : 0;
    unsigned char low, high;
    if (size == 0 || size > length)
        return 0;
    second_range(b[0], &low, &high);
    if (b[1] < low || b[1] > high)
        return 0;
    for (size_t i = 2; i < size; i++)
        if (b[i] < 0x80 || b[i] > 0xbf)
            return 0;
    return size;
}

const char *sheet_utf8_fault(const char *bytes, size_t length)
{
    for (size_t at = 0; at < length;) {
        unsigned char byte = (unsigned char)bytes[at];
        if ((byte < 0x20 && byte != '\t') || byte == 0x7f)
            return "control character";
        size_t size = sheet_utf8_length(bytes + at, length - at);
        if (size == 0)
            return "not UTF-8 text";
        if (size == 2 && byte == 0xc2 && (unsigned char)bytes[at + 1] < 0xa0)
            return "control character";
        at += size;
    }
    return NULL;
}
