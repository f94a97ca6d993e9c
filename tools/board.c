/* SPDX-License-Identifier: Apache-2.0 */
#include "tools/board.h"

#include <stdlib.h>
#include <string.h>

#include <cjson/cJSON.h>

#include "core/model/rig.h"

enum {
    BOARD_TRACKS_MAX = 32,
    BOARD_STATES_MAX = 6, /* shown per track                             */
    BOARD_TEXT_SIZE = 96
};

struct board_row {
    char track[RIG_ID_SIZE];
    char verdict[16], why[BOARD_TEXT_SIZE], time[40];
    int n; /* states that arrived, BOARD_STATES_MAX at most */
    bool is_number[BOARD_STATES_MAX];
    double x[BOARD_STATES_MAX], u[BOARD_STATES_MAX];
};

struct board {
    cJSON *description;
    int n, n_hidden; /* n_hidden: estimates of tracks beyond the table */
    int n_drawn;     /* lines on the terminal                       */
    char event[BOARD_TEXT_SIZE];
    struct board_row row[BOARD_TRACKS_MAX];
};

struct board *board_new(void)
{
    return calloc(1, sizeof(struct board));
}

void board_free(struct board *board)
{
    if (board != NULL)
        cJSON_Delete(board->description);
    free(board);
}

static const char *text_of(const cJSON *object, const char *key)
{
    const char *text =
        cJSON_GetStringValue(cJSON_GetObjectItemCaseSensitive(object, key));
    return text == NULL ? "" : text;
}

static struct board_row *row_of(struct board *board, const char *track)
{
    for (int i = 0; i < board->n; i++)
        if (strcmp(board->row[i].track, track) == 0)
            return &board->row[i];
    if (board->n == BOARD_TRACKS_MAX) {
        board->n_hidden++;
        return NULL;
    }
    struct board_row *row = &board->row[board->n++];
    snprintf(row->track, sizeof row->track, "%s", track);
    return row;
}

static void take_verdict(struct board_row *row, const cJSON *message)
{
    snprintf(row->verdict, sizeof row->verdict, "%s",
             text_of(message, "verdict"));
    row->why[0] = '\0';
    const cJSON *item;
    cJSON_ArrayForEach(item, cJSON_GetObjectItemCaseSensitive(message, "why"))
    {
        size_t len = strlen(row->why);
        const char *reason = cJSON_GetStringValue(item);
        if (reason != NULL)
            snprintf(row->why + len, sizeof row->why - len, "%s%s",
                     len == 0 ? "" : ", ", reason);
    }
}

static void take_estimate(struct board *board, const cJSON *message)
{
    struct board_row *row = row_of(board, text_of(message, "track"));
    if (row == NULL)
        return;
    take_verdict(row, message);
    snprintf(row->time, sizeof row->time, "%s", text_of(message, "t"));
    const cJSON *x = cJSON_GetObjectItemCaseSensitive(message, "x");
    const cJSON *u = cJSON_GetObjectItemCaseSensitive(message, "u");
    for (row->n = 0; row->n < BOARD_STATES_MAX; row->n++) {
        const cJSON *x_i = cJSON_GetArrayItem(x, row->n);
        const cJSON *u_i = cJSON_GetArrayItem(u, row->n);
        if (x_i == NULL)
            break;
        row->is_number[row->n] = cJSON_IsNumber(x_i) && cJSON_IsNumber(u_i);
        row->x[row->n] = x_i->valuedouble;
        row->u[row->n] = u_i == NULL ? 0 : u_i->valuedouble;
    }
}

static void take_event(struct board *board, const cJSON *message)
{
    const char *event = text_of(message, "event");
    bool is_verdict = strcmp(event, "verdict") == 0;
    struct board_row *row =
        is_verdict ? row_of(board, text_of(message, "track")) : NULL;
    if (row != NULL)
        take_verdict(row, message);
    snprintf(board->event, sizeof board->event, "%s %s %s %s",
             text_of(message, "t"), event, text_of(message, "track"),
             text_of(message, is_verdict ? "verdict" : "sensor"));
}

void board_take(struct board *board, const char *line)
{
    cJSON *message = cJSON_Parse(line);
    const char *type = text_of(message, "type");
    if (strcmp(type, "description") == 0) {
        cJSON_Delete(board->description);
        board->description = message;
        return;
    }
    if (strcmp(type, "estimate") == 0)
        take_estimate(board, message);
    else if (strcmp(type, "event") == 0)
        take_event(board, message);
    cJSON_Delete(message);
}

void board_close(struct board *board)
{
    for (int i = 0; i < board->n; i++)
        snprintf(board->row[i].verdict, sizeof board->row[i].verdict, "%s",
                 "(old)");
    snprintf(board->event, sizeof board->event,
             "the connection ended: nothing above is current");
}

/* States of the description's track that an id belongs to, or NULL. */
static const cJSON *states_of(const struct board *board, const char *track)
{
    const cJSON *tracks =
        cJSON_GetObjectItemCaseSensitive(board->description, "tracks");
    const cJSON *kind, *best = NULL;
    size_t best_len = 0;
    cJSON_ArrayForEach(kind, tracks)
    {
        const char *id = text_of(kind, "id");
        size_t len = strlen(id);
        if (strcmp(id, track) == 0)
            return cJSON_GetObjectItemCaseSensitive(kind, "states");
        if (len > best_len && id[len - 1] == '*' &&
            strncmp(id, track, len - 1) == 0) {
            best = kind;
            best_len = len;
        }
    }
    return cJSON_GetObjectItemCaseSensitive(best, "states");
}

/* Words first: good is plain, what needs a look is bold, lost is reversed. */
static const char *style_of(const char *verdict)
{
    if (strcmp(verdict, "good") == 0)
        return "";
    return strcmp(verdict, "lost") == 0 ? "\033[7m" : "\033[1m";
}

static void draw_row(struct board *board, const struct board_row *row, FILE *to,
                     bool in_style)
{
    fprintf(to, "\033[K%-20s %s%-9s%s %.23s  %s\n", row->track,
            in_style ? style_of(row->verdict) : "", row->verdict,
            in_style ? "\033[0m" : "", row->time, row->why);
    board->n_drawn++;
    const cJSON *states = states_of(board, row->track);
    for (int i = 0; i < row->n; i++) {
        const cJSON *state = cJSON_GetArrayItem(states, i);
        fprintf(to, "\033[K  %-18s ", text_of(state, "name"));
        if (row->is_number[i])
            fprintf(to, "%14.6g +/- %-10.3g %s\n", row->x[i], 2 * row->u[i],
                    text_of(state, "unit"));
        else
            fputs("not determined yet\n", to);
        board->n_drawn++;
    }
}

void board_draw(struct board *board, FILE *to, bool in_style)
{
    if (board->n_drawn > 0)
        fprintf(to, "\033[%dA", board->n_drawn);
    fprintf(to,
            "\033[KTrack                Verdict   Time (UTC)%15s"
            "x +/- U (k = 2)\n",
            "");
    board->n_drawn = 1;
    for (int i = 0; i < board->n; i++)
        draw_row(board, &board->row[i], to, in_style);
    if (board->n_hidden > 0) {
        fprintf(to,
                "\033[Kmore tracks than %d are not shown; choose with "
                "--tracks\n",
                BOARD_TRACKS_MAX);
        board->n_drawn++;
    }
    fprintf(to, "\033[K%s\n", board->event);
    board->n_drawn++;
    fflush(to);
}
