/* Ziggurats: Marsaglia & Tsang 2000, J. Stat. Softw. 5(8), with 256 layers each. Gamma by
 * rejection: Marsaglia & Tsang 2000, ACM Trans. Math. Softw. 26:363. */

#include "hand_loop.h"

#include <math.h>
#include <stdbool.h>
#include <stdlib.h>

enum { LAYERS = 256 };

static double exponential_x[LAYERS + 1], exponential_y[LAYERS + 1];
static double normal_x[LAYERS + 1], normal_y[LAYERS + 1];

/* Layers of equal area under a decreasing density f with f(0) = 1, from the tail's start r. */
static void fill(double *x, double *y, double r, double area, double (*f)(double),
                 double (*inverse)(double)) {
    x[0] = area / f(r);
    x[1] = r;
    y[0] = 0;
    y[1] = f(r);
    for (int i = 2; i < LAYERS; i++) {
        y[i] = y[i - 1] + area / x[i - 1];
        x[i] = inverse(y[i]);
    }
    x[LAYERS] = 0;
    y[LAYERS] = 1;
}

static double exponential_density(double x) {
    return exp(-x);
}

static double exponential_inverse(double y) {
    return -log(y);
}

static double normal_density(double x) {
    return exp(-x * x / 2);
}

static double normal_inverse(double y) {
    return sqrt(-2 * log(y));
}

void hand_loop_set_up(void) {
    fill(exponential_x, exponential_y, 7.69711747013104972, 0.0039496598225815571993,
         exponential_density, exponential_inverse);
    fill(normal_x, normal_y, 3.6541528853610088, 0.00492867323399, normal_density, normal_inverse);
}

static inline uint64_t rotl(uint64_t x, int k) {
    return (x << k) | (x >> (64 - k));
}

static inline uint64_t next(uint64_t s[4]) {
    const uint64_t result = s[0] + s[3];
    const uint64_t t = s[1] << 17;
    s[2] ^= s[0];
    s[3] ^= s[1];
    s[1] ^= s[2];
    s[0] ^= s[3];
    s[2] ^= t;
    s[3] = rotl(s[3], 45);
    return result;
}

static inline double uniform(uint64_t s[4]) {
    return (double)(next(s) >> 11) * 0x1p-53;
}

static inline double exponential(uint64_t s[4]) {
    double shift = 0;
    for (;;) {
        const uint64_t bits = next(s);
        const unsigned i = bits & (LAYERS - 1);
        const double x = (double)(bits >> 11) * 0x1p-53 * exponential_x[i];
        if (x < exponential_x[i + 1])
            return shift + x;
        if (i == 0)
            shift += exponential_x[1];
        else if (exponential_y[i] + uniform(s) * (exponential_y[i + 1] - exponential_y[i]) <
                 exp(-x))
            return shift + x;
    }
}

static inline double normal(uint64_t s[4]) {
    for (;;) {
        const uint64_t bits = next(s);
        const unsigned i = bits & (LAYERS - 1);
        const double x = (double)(bits >> 11) * 0x1p-53 * normal_x[i];
        const double sign = bits & LAYERS ? -1 : 1;
        if (x < normal_x[i + 1])
            return sign * x;
        if (i == 0) {
            double u, v;
            do {
                u = exponential(s) / normal_x[1];
                v = exponential(s);
            } while (2 * v < u * u);
            return sign * (normal_x[1] + u);
        }
        if (normal_y[i] + uniform(s) * (normal_y[i + 1] - normal_y[i]) < exp(-x * x / 2))
            return sign * x;
    }
}

typedef struct gamma_law {
    double d, c, scale;
} gamma_law;

/* For shapes of 1 or more. */
static gamma_law gamma_of(double mean, double sd) {
    const double d = mean * mean / (sd * sd) - 1.0 / 3;
    return (gamma_law){d, 1 / sqrt(9 * d), sd * sd / mean};
}

static inline double gamma_draw(const gamma_law *law, uint64_t s[4]) {
    for (;;) {
        const double x = normal(s);
        const double v = 1 + law->c * x;
        if (v <= 0)
            continue;
        const double v3 = v * v * v;
        const double u = uniform(s);
        if (u < 1 - 0.0331 * x * x * x * x || log(u) < x * x / 2 + law->d * (1 - v3 + log(v3)))
            return law->d * v3 * law->scale;
    }
}

typedef struct event {
    double due;
    int kind; /* 0: a transcript, 1: a protein */
} event;

typedef struct event_heap {
    event *events;
    size_t n, capacity;
} event_heap;

static inline int push(event_heap *heap, double due, int kind) {
    if (heap->n == heap->capacity) {
        const size_t capacity = heap->capacity ? 2 * heap->capacity : 1024;
        event *events = realloc(heap->events, capacity * sizeof *events);
        if (!events)
            return 1;
        heap->events = events;
        heap->capacity = capacity;
    }
    size_t i = heap->n++;
    event *const e = heap->events;
    while (i > 0 && e[(i - 1) / 2].due > due) {
        e[i] = e[(i - 1) / 2];
        i = (i - 1) / 2;
    }
    e[i] = (event){due, kind};
    return 0;
}

static inline int pop(event_heap *heap) {
    event *const e = heap->events;
    const int kind = e[0].kind;
    const event last = e[--heap->n];
    const size_t n = heap->n;
    size_t i = 0;
    for (size_t child = 1; child < n; child = 2 * i + 1) {
        if (child + 1 < n && e[child + 1].due < e[child].due)
            child++;
        if (last.due <= e[child].due)
            break;
        e[i] = e[child];
        i = child;
    }
    e[i] = last;
    return kind;
}

static void seed_stream(uint64_t s[4], uint64_t seed) {
    for (int i = 0; i < 4; i++) {
        uint64_t z = seed += UINT64_C(0x9e3779b97f4a7c15);
        z = (z ^ (z >> 30)) * UINT64_C(0xbf58476d1ce4e5b9);
        z = (z ^ (z >> 27)) * UINT64_C(0x94d049bb133111eb);
        s[i] = z ^ (z >> 31);
    }
}

static inline int heap_loop(const hand_model *model, bool is_gamma, double until, uint64_t seed,
                            hand_result *result) {
    uint64_t s[4];
    seed_stream(s, seed);
    gamma_law laws[2] = {{0}};
    if (is_gamma) {
        laws[0] = gamma_of(model->transcript_lag, model->transcript_lag_sd);
        laws[1] = gamma_of(model->protein_lag, model->protein_lag_sd);
    }
    const double k_open = model->k_open, k_shut = model->k_shut, k_init = model->k_init;
    const double dm = model->transcript_decay, kp = model->k_translate, dp = model->protein_decay;
    event_heap heap = {0};
    int64_t firings = 0, completions = 0;
    double t = 0, m = 0, p = 0;
    bool on = false;
    int failed = 0;
    while (!failed) {
        const double a_switch = on ? k_shut : k_open;
        const double a_init = on ? k_init : 0;
        const double a_translate = kp * m, a_protein = dp * p, a_transcript = dm * m;
        const double total = a_translate + a_protein + a_transcript + a_init + a_switch;
        const double next_t = t + exponential(s) / total;
        const double due = heap.n ? heap.events[0].due : INFINITY;
        if (due < next_t) {
            if (due > until)
                break;
            t = due;
            if (pop(&heap))
                p += 1;
            else
                m += 1;
            completions++;
            continue;
        }
        t = next_t;
        if (t > until)
            break;
        firings++;
        double choice = uniform(s) * total;
        if ((choice -= a_translate) < 0)
            failed = push(&heap, t + (is_gamma ? gamma_draw(&laws[1], s) : model->protein_lag), 1);
        else if ((choice -= a_protein) < 0)
            p -= 1;
        else if ((choice -= a_transcript) < 0)
            m -= 1;
        else if ((choice -= a_init) < 0)
            failed = push(&heap, t + (is_gamma ? gamma_draw(&laws[0], s) : model->transcript_lag),
                          0);
        else
            on = !on;
    }
    free(heap.events);
    *result = (hand_result){firings, completions, m, p};
    return failed;
}

int hand_loop_fixed(const hand_model *model, double until, uint64_t seed, hand_result *result) {
    return heap_loop(model, false, until, seed, result);
}

int hand_loop_gamma(const hand_model *model, double until, uint64_t seed, hand_result *result) {
    return heap_loop(model, true, until, seed, result);
}

/* First in, first out: enough where every lag of a kind has one length. */
typedef struct due_ring {
    double *due;
    size_t head, n, capacity; /* a power of two */
} due_ring;

static inline int append(due_ring *ring, double due) {
    if (ring->n == ring->capacity) {
        const size_t capacity = ring->capacity ? 2 * ring->capacity : 1024;
        double *bigger = malloc(capacity * sizeof *bigger);
        if (!bigger)
            return 1;
        for (size_t i = 0; i < ring->n; i++)
            bigger[i] = ring->due[(ring->head + i) & (ring->capacity - 1)];
        free(ring->due);
        ring->due = bigger;
        ring->head = 0;
        ring->capacity = capacity;
    }
    ring->due[(ring->head + ring->n++) & (ring->capacity - 1)] = due;
    return 0;
}

static inline double first(const due_ring *ring) {
    return ring->n ? ring->due[ring->head] : INFINITY;
}

static inline void drop(due_ring *ring) {
    ring->head = (ring->head + 1) & (ring->capacity - 1);
    ring->n--;
}

int hand_loop_fixed_rings(const hand_model *model, double until, uint64_t seed,
                          hand_result *result) {
    uint64_t s[4];
    seed_stream(s, seed);
    const double k_open = model->k_open, k_shut = model->k_shut, k_init = model->k_init;
    const double dm = model->transcript_decay, kp = model->k_translate, dp = model->protein_decay;
    due_ring transcripts = {0}, proteins = {0};
    int64_t firings = 0, completions = 0;
    double t = 0, m = 0, p = 0;
    bool on = false;
    int failed = 0;
    while (!failed) {
        const double a_switch = on ? k_shut : k_open;
        const double a_init = on ? k_init : 0;
        const double a_translate = kp * m, a_protein = dp * p, a_transcript = dm * m;
        const double total = a_translate + a_protein + a_transcript + a_init + a_switch;
        const double next_t = t + exponential(s) / total;
        const double due_m = first(&transcripts), due_p = first(&proteins);
        const double due = due_m < due_p ? due_m : due_p;
        if (due < next_t) {
            if (due > until)
                break;
            t = due;
            if (due_m < due_p) {
                drop(&transcripts);
                m += 1;
            } else {
                drop(&proteins);
                p += 1;
            }
            completions++;
            continue;
        }
        t = next_t;
        if (t > until)
            break;
        firings++;
        double choice = uniform(s) * total;
        if ((choice -= a_translate) < 0)
            failed = append(&proteins, t + model->protein_lag);
        else if ((choice -= a_protein) < 0)
            p -= 1;
        else if ((choice -= a_transcript) < 0)
            m -= 1;
        else if ((choice -= a_init) < 0)
            failed = append(&transcripts, t + model->transcript_lag);
        else
            on = !on;
    }
    free(transcripts.due);
    free(proteins.due);
    *result = (hand_result){firings, completions, m, p};
    return failed;
}
