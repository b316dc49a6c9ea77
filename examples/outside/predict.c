/* First-order Taylor of ranges and bearings in C11, to be scored by Gaussworthy.
 *
 *     cc -std=c11 -O2 -o predict predict.c -lm
 *     ./predict < cases.jsonl > answers.jsonl
 *
 * Reads case records, writes moments records, one JSON object a line. Knows the sensors range-bearing and
 * bearing-only; any other is said on standard error and left out. Nothing here is shared with Gaussworthy:
 *
 *     mu = h(m),  S = J P J' + R,  C = P J',  J = h'(m) by hand
 */

#include <ctype.h>
#include <math.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static void *need(void *memory) {
    if (!memory) {
        fputs("predict: out of memory\n", stderr);
        exit(3);
    }
    return memory;
}

static double *zeros(size_t count) { return need(calloc(count ? count : 1, sizeof(double))); }

/* --- Just enough JSON: a value is a tree, text stays in the line it was read from. --- */

typedef enum { NOTHING, NUMBER, TEXT, LIST, OBJECT } Type;

typedef struct Value {
    Type type;
    double number;
    const char *key, *text; /* between the quotes, escapes as they were written */
    size_t key_length, length;
    struct Value *first, *next;
} Value;

static void release(Value *value) {
    while (value) {
        Value *next = value->next;
        release(value->first);
        free(value);
        value = next;
    }
}

static const char *skip_blanks(const char *at) {
    while (isspace((unsigned char)*at)) at++;
    return at;
}

/* The end of the text that begins at `at`, behind its first quote; NULL if it has none. */
static const char *end_of_text(const char *at) {
    while (*at && *at != '"') at += *at == '\\' && at[1] ? 2 : 1;
    return *at ? at : NULL;
}

/* Reads the value at `*at` into `value` and goes behind it; false where there is none. */
static bool parse(const char **at, Value *value, int depth) {
    *at = skip_blanks(*at);
    char opened = **at;
    if (depth > 64) return false;
    if (opened == '"') {
        const char *end = end_of_text(*at + 1);
        if (!end) return false;
        value->type = TEXT;
        value->text = *at + 1;
        value->length = (size_t)(end - value->text);
        *at = end + 1;
        return true;
    }
    if (opened == '[' || opened == '{') {
        char closing = opened == '[' ? ']' : '}';
        Value **last = &value->first;
        value->type = opened == '[' ? LIST : OBJECT;
        *at = skip_blanks(*at + 1);
        if (**at == closing) return ++*at, true;
        for (;;) {
            Value *entry = *last = need(calloc(1, sizeof(Value)));
            last = &entry->next;
            if (opened == '{') {
                Value key = {0};
                if (!parse(at, &key, depth + 1) || key.type != TEXT) return release(key.first), false;
                entry->key = key.text;
                entry->key_length = key.length;
                *at = skip_blanks(*at);
                if (*(*at)++ != ':') return false;
            }
            if (!parse(at, entry, depth + 1)) return false;
            *at = skip_blanks(*at);
            if (**at == closing) return ++*at, true;
            if (*(*at)++ != ',') return false;
        }
    }
    for (const char *const *word = (const char *const[]){"true", "false", "null", NULL}; *word; word++) {
        if (strncmp(*at, *word, strlen(*word)) == 0) return *at += strlen(*word), true;
    }
    char *end;
    value->type = NUMBER;
    value->number = strtod(*at, &end);
    if (end == *at) return false;
    *at = end;
    return true;
}

static Value *get(const Value *object, const char *key) {
    Value *entry = object ? object->first : NULL;
    while (entry && !(entry->key_length == strlen(key) && strncmp(entry->key, key, entry->key_length) == 0))
        entry = entry->next;
    return entry;
}

static bool is_text(const Value *value, const char *text) {
    return value && value->type == TEXT && value->length == strlen(text) &&
           strncmp(value->text, text, value->length) == 0;
}

static size_t count(const Value *list) {
    size_t length = 0;
    for (const Value *entry = list ? list->first : NULL; entry; entry = entry->next) length++;
    return length;
}

/* `length` numbers of a list into `to`; false if it has not as many. */
static bool numbers(const Value *list, double *to, size_t length) {
    if (!list || list->type != LIST || count(list) != length) return false;
    for (const Value *entry = list->first; entry; entry = entry->next) {
        if (entry->type != NUMBER) return false;
        *to++ = entry->number;
    }
    return true;
}

/* A size x size matrix into `to`, row by row; one number stands for itself times the identity, nothing for zero. */
static bool square(const Value *value, double *to, size_t size) {
    if (!value) return true;
    if (value->type == NUMBER) {
        for (size_t i = 0; i < size; i++) to[i * size + i] = value->number;
        return true;
    }
    if (value->type != LIST || count(value) != size) return false;
    for (const Value *row = value->first; row; row = row->next, to += size)
        if (!numbers(row, to, size)) return false;
    return true;
}

/* --- The method. --- */

static void write_matrix(const char *key, const double *matrix, size_t rows, size_t columns) {
    printf(",\"%s\":[", key);
    for (size_t i = 0; i < rows; i++) {
        printf(i ? ",[" : "[");
        for (size_t j = 0; j < columns; j++) printf("%s%.17g", j ? "," : "", matrix[i * columns + j]);
        printf("]");
    }
    printf("]");
}

/* Writes the moments record of a case record; why not, if it cannot. */
static const char *answer(const Value *record) {
    const Value *name = get(record, "case"), *sensor = get(record, "sensor"), *prior = get(record, "prior");
    const Value *kind = get(sensor, "kind"), *position = get(sensor, "position");
    const Value *one = get(sensor, "station"), *several = get(sensor, "stations");
    if (!name || name->type != TEXT) return "names no case";
    bool ranges = is_text(kind, "range-bearing");
    if (!ranges && !is_text(kind, "bearing-only")) return "its sensor is not known here";

    size_t n = count(get(prior, "mean")), stations = several ? count(several) : 1;
    size_t outputs = ranges ? 2 : 1, p = outputs * stations; /* of one station, and of all */
    double *m = zeros(n), *P = zeros(n * n), *R = zeros(p * p);
    double *mu = zeros(p), *J = zeros(p * n), *C = zeros(n * p), *S = zeros(p * p);
    double at[2] = {0, 1};
    const char *why = NULL;
    if (!numbers(get(prior, "mean"), m, n) || !square(get(prior, "covariance"), P, n) ||
        !square(get(get(record, "noise"), "covariance"), R, p) || (position && !numbers(position, at, 2)) ||
        !(at[0] >= 0 && at[0] < (double)n && at[1] >= 0 && at[1] < (double)n)) {
        why = "its prior, noise or position is not as it should be";
        goto done;
    }
    size_t ix = (size_t)at[0], iy = (size_t)at[1];
    const Value *station = several ? several->first : one;
    for (size_t j = 0; j < p; j += outputs, station = station->next) {
        double place[2];
        if (!numbers(station, place, 2)) {
            why = "a station is not as it should be";
            goto done;
        }
        double x = m[ix] - place[0], y = m[iy] - place[1], r = hypot(x, y);
        if (ranges) {
            mu[j] = r;
            J[j * n + ix] = x / r;
            J[j * n + iy] = y / r;
        }
        size_t bearing = j + outputs - 1;
        mu[bearing] = atan2(y, x);
        J[bearing * n + ix] = -y / (r * r);
        J[bearing * n + iy] = x / (r * r);
    }
    for (size_t i = 0; i < n; i++)
        for (size_t j = 0; j < p; j++)
            for (size_t k = 0; k < n; k++) C[i * p + j] += P[i * n + k] * J[j * n + k];
    for (size_t i = 0; i < p; i++)
        for (size_t j = 0; j < p; j++) {
            S[i * p + j] = R[i * p + j];
            for (size_t k = 0; k < n; k++) S[i * p + j] += J[i * n + k] * C[k * p + j];
        }
    for (size_t j = 0; j < p; j++)
        if (!isfinite(mu[j]) || !isfinite(S[j * p + j])) why = "the result is not finite";
    if (why) goto done;

    printf("{\"case\":\"%.*s\",\"mean\":[", (int)name->length, name->text);
    for (size_t j = 0; j < p; j++) printf("%s%.17g", j ? "," : "", mu[j]);
    printf("]");
    write_matrix("covariance", S, p, p);
    write_matrix("cross_covariance", C, n, p);
    printf("}\n");
    fflush(stdout);
done:
    free(m), free(P), free(R), free(mu), free(J), free(C), free(S);
    return why;
}

/* The next line into `*line`, which grows as needed; false at the end. */
static bool read_line(char **line, size_t *size) {
    size_t length = 0;
    int c;
    while ((c = getchar()) != EOF && c != '\n') {
        if (length + 1 >= *size) *line = need(realloc(*line, *size = 2 * *size + 256));
        (*line)[length++] = (char)c;
    }
    if (c == EOF && length == 0) return false;
    if (*size == 0) *line = need(realloc(*line, *size = 256));
    (*line)[length] = '\0';
    return true;
}

int main(void) {
    char *line = NULL;
    size_t size = 0;
    for (unsigned long number = 1; read_line(&line, &size); number++) {
        Value record = {0};
        const char *at = line;
        const char *why = NULL;
        if (*skip_blanks(line)) why = parse(&at, &record, 0) && record.type == OBJECT ? answer(&record) : "is no record";
        if (why) fprintf(stderr, "line %lu: %s; left out\n", number, why);
        release(record.first);
    }
    free(line);
    return 0;
}
