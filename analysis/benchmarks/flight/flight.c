/* Flights of atoms from a body's ground to their end, one at a time: what the package's kernels are measured against.
 *
 * Dormand-Prince 5(4) with dense output; gravity, the Sun's tide, the turning frame, radiation pressure of two lines at
 * each atom's Doppler velocity, a penumbra by the overlap of two discs, ionisation. A step ends at the ground, the
 * outer sphere, an edge of the shadow or the age limit.
 *
 *   flight CASE TALLY ROUNDS ENDS
 *
 * TALLY: 0 nothing, 1 density, one random sample a step, 2 all that the package counts. Prints one line for each round:
 * processor seconds, accepted steps, trial steps. ENDS gets ending, time, x, y, z, survival of each flight.
 */
#include <math.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

enum { LIT, PENUMBRA, UMBRA };
enum { FLYING = -1, LANDED, CROSSED, AGED, UNRESOLVED };
enum { STATE = 7, LINES = 2, ENDS = 6 }; /* x y z vx vy vz and the hazard, whose exp(-) is the survival */

typedef struct {
    double first, per_step;
    int last;
    const double *push, *g;
} Line;

typedef struct {
    double gm, radius, outer_radius, tide_gm, distance, radial_velocity, turning, light_distance, ionization;
    double sun_radius, penumbra_sine, penumbra_cosine, umbra_sine, umbra_cosine;
    double allowed, first_share, age_limit, weight;
    double first_altitude, cells_per_log;
    int layers, rows, columns;
    const double *radii;
    Line line[LINES];
} Case;

typedef struct {
    double *density, *column, *ionized, *emission[LINES], *released, *landed, *captured, *escaped, *directions;
    double life, ionized_total, captured_total, escaped_total, aged_total, unresolved_total;
} Tally;

typedef struct { /* an accepted step: start, length, part flown, dense output */
    double h, flown;
    double c[5][STATE];
} Curve;

static uint64_t rng_state[4];

static inline double random01(void) /* xoshiro256+ (Blackman & Vigna 2021) */
{
    uint64_t *s = rng_state, result = s[0] + s[3], t = s[1] << 17;
    s[2] ^= s[0];
    s[3] ^= s[1];
    s[1] ^= s[2];
    s[0] ^= s[3];
    s[2] ^= t;
    s[3] = (s[3] << 45) | (s[3] >> 19);
    return (double)(result >> 11) * 0x1.0p-53;
}

static inline double table_value(const Line *line, const double *table, double velocity)
{
    double step = (velocity - line->first) * line->per_step;
    if (step <= 0.0)
        return table[0];
    if (step >= line->last)
        return table[line->last];
    int knot = (int)step;
    return table[knot] + (step - knot) * (table[knot + 1] - table[knot]);
}

/* Part of the unit disc covered by a disc whose near edge lies at `limb` from its centre, of the given curvature. */
static double covered(double limb, double curvature)
{
    if (limb >= 1.0)
        return 0.0;
    if (limb <= -1.0)
        return curvature * (1.0 - limb) <= 2.0 ? 1.0 : 1.0 / (curvature * curvature);
    double chord = (limb + 0.5 * curvature * (1.0 + limb * limb)) / (1.0 + curvature * limb);
    if (fabs(chord) >= 1.0)
        return fmin(1.0, 1.0 / (curvature * curvature));
    double half = sqrt(1.0 - chord * chord);
    double sine = curvature * half, cosine = 1.0 - curvature * (chord - limb), angle = atan2(sine, cosine);
    double bulge;
    if (fabs(angle) > 0.2) {
        bulge = (angle - sine * cosine) / (curvature * curvature);
    } else {
        double a2 = angle * angle;
        bulge = half * half * angle *
                (2.0 / 3.0 + a2 * (4.0 / 45.0 + a2 * (4.0 / 315.0 + a2 * (8.0 / 4725.0 + a2 * (4.0 / 18711.0)))));
    }
    return fmin(1.0, fmax(0.0, (acos(chord) - chord * half + bulge) / M_PI));
}

/* Visible part of the Sun's disc: two circles in the stereographic projection about the Sun's centre. */
static double visible(const Case *c, double x, double y, double z)
{
    double r2 = x * x + y * y + z * z, sx = c->distance - x;
    double sin_body = fmin(1.0, c->radius / sqrt(r2)), cos_body = sqrt(1.0 - sin_body * sin_body);
    double across = c->distance * sqrt(y * y + z * z), along = r2 - x * c->distance;
    double separation = atan2(across, along);
    double cos_separation = along / sqrt(across * across + along * along);
    double limb = 2.0 * tan(0.5 * (separation - asin(sin_body)));
    double curvature = (cos_separation + cos_body) / (2.0 * sin_body);
    double disc = 2.0 * tan(0.5 * asin(c->sun_radius / sqrt(sx * sx + y * y + z * z)));
    return 1.0 - covered(limb / disc, curvature * disc);
}

static inline void rates(const Case *c, int zone, const double *s, double *d)
{
    double x = s[0], y = s[1], z = s[2], vx = s[3], vy = s[4], vz = s[5];
    double r2 = x * x + y * y + z * z, pull = c->gm / (r2 * sqrt(r2));
    double sx = c->distance - x, per_s = 1.0 / sqrt(sx * sx + y * y + z * z);
    double sunward = c->tide_gm * per_s * per_s, light = 0.0;
    if (zone != UMBRA) {
        light = c->light_distance * per_s * c->light_distance * per_s;
        if (zone == PENUMBRA)
            light *= visible(c, x, y, z);
        double receding = (y * vy + z * vz - sx * (vx - c->radial_velocity)) * per_s, push = 0.0;
        for (int i = 0; i < LINES; i++)
            push += table_value(&c->line[i], c->line[i].push, receding);
        sunward -= light * push;
    }
    sunward *= per_s;
    double w = c->turning;
    d[0] = vx;
    d[1] = vy;
    d[2] = vz;
    d[3] = -pull * x + sunward * sx - c->tide_gm / (c->distance * c->distance) + w * (2.0 * vy + w * x);
    d[4] = -(pull + sunward) * y + w * (w * y - 2.0 * vx);
    d[5] = -(pull + sunward) * z;
    d[6] = light * c->ionization;
}

/* One trial step: end, slopes at the end and the squared error in units of what the tolerance allows. */
static inline double trial(const Case *c, int zone, double h, const double *s, double k[7][STATE], double *end)
{
    double t[STATE];
    for (int i = 0; i < STATE; i++)
        t[i] = s[i] + h * 0.2 * k[0][i];
    rates(c, zone, t, k[1]);
    for (int i = 0; i < STATE; i++)
        t[i] = s[i] + h * (3.0 / 40.0 * k[0][i] + 9.0 / 40.0 * k[1][i]);
    rates(c, zone, t, k[2]);
    for (int i = 0; i < STATE; i++)
        t[i] = s[i] + h * (44.0 / 45.0 * k[0][i] - 56.0 / 15.0 * k[1][i] + 32.0 / 9.0 * k[2][i]);
    rates(c, zone, t, k[3]);
    for (int i = 0; i < STATE; i++)
        t[i] = s[i] + h * (19372.0 / 6561.0 * k[0][i] - 25360.0 / 2187.0 * k[1][i] + 64448.0 / 6561.0 * k[2][i] -
                           212.0 / 729.0 * k[3][i]);
    rates(c, zone, t, k[4]);
    for (int i = 0; i < STATE; i++)
        t[i] = s[i] + h * (9017.0 / 3168.0 * k[0][i] - 355.0 / 33.0 * k[1][i] + 46732.0 / 5247.0 * k[2][i] +
                           49.0 / 176.0 * k[3][i] - 5103.0 / 18656.0 * k[4][i]);
    rates(c, zone, t, k[5]);
    for (int i = 0; i < STATE; i++)
        end[i] = s[i] + h * (35.0 / 384.0 * k[0][i] + 500.0 / 1113.0 * k[2][i] + 125.0 / 192.0 * k[3][i] -
                             2187.0 / 6784.0 * k[4][i] + 11.0 / 84.0 * k[5][i]);
    rates(c, zone, end, k[6]);
    double e[STATE];
    for (int i = 0; i < STATE; i++)
        e[i] = h * (71.0 / 57600.0 * k[0][i] - 71.0 / 16695.0 * k[2][i] + 71.0 / 1920.0 * k[3][i] -
                    17253.0 / 339200.0 * k[4][i] + 22.0 / 525.0 * k[5][i] - 1.0 / 40.0 * k[6][i]);
    double r2 = s[0] * s[0] + s[1] * s[1] + s[2] * s[2];
    double speed2 = s[3] * s[3] + s[4] * s[4] + s[5] * s[5] + c->gm / sqrt(r2);
    return ((e[0] * e[0] + e[1] * e[1] + e[2] * e[2]) / r2 + (e[3] * e[3] + e[4] * e[4] + e[5] * e[5]) / speed2 +
            e[6] * e[6]) / (c->allowed * c->allowed);
}

static inline double step_change(double error)
{
    if (!(error < 1e30))
        return 0.2;
    if (error < 1e-12)
        return 5.0;
    return fmin(5.0, fmax(0.2, 0.9 * pow(error, -0.1)));
}

static inline void make_curve(Curve *curve, double h, const double *s, const double *end, double k[7][STATE])
{
    curve->h = h;
    curve->flown = 1.0;
    for (int i = 0; i < STATE; i++) {
        double growth = end[i] - s[i], bend = h * k[0][i] - growth;
        curve->c[0][i] = s[i];
        curve->c[1][i] = growth;
        curve->c[2][i] = bend;
        curve->c[3][i] = growth - h * k[6][i] - bend;
        curve->c[4][i] =
            h * (-12715105075.0 / 11282082432.0 * k[0][i] + 87487479700.0 / 32700410799.0 * k[2][i] -
                 10690763975.0 / 1880347072.0 * k[3][i] + 701980252875.0 / 199316789632.0 * k[4][i] -
                 1453857185.0 / 822651844.0 * k[5][i] + 69997945.0 / 29380423.0 * k[6][i]);
    }
}

static inline void state_at(const Curve *curve, double part, double *s)
{
    double rest = 1.0 - part;
    for (int i = 0; i < STATE; i++)
        s[i] = curve->c[0][i] +
               part * (curve->c[1][i] +
                       rest * (curve->c[2][i] + part * (curve->c[3][i] + rest * curve->c[4][i])));
}

static inline double dot(const double *a, const double *b)
{
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2];
}

/* Heights over the cones that bound penumbra and umbra; behind the body, within the umbra's length. */
static inline double penumbra_height(const Case *c, double x, double rho)
{
    return fmax(rho * c->penumbra_cosine + x * c->penumbra_sine - c->radius, x - c->radius * c->penumbra_sine);
}

static inline double umbra_height(const Case *c, double x, double rho)
{
    return fmax(rho * c->umbra_cosine - x * c->umbra_sine - c->radius, x + c->radius * c->umbra_sine);
}

static inline int zone_at(const Case *c, const double *s)
{
    double rho = sqrt(s[1] * s[1] + s[2] * s[2]);
    if (penumbra_height(c, s[0], rho) >= 0.0)
        return LIT;
    return umbra_height(c, s[0], rho) < 0.0 ? UMBRA : PENUMBRA;
}

/* Time in which an atom crosses the penumbra straight on, and the time to its nearest edge. */
static double crossing_time(const Case *c, const double *s)
{
    double rho = sqrt(s[1] * s[1] + s[2] * s[2]);
    return (umbra_height(c, s[0], rho) - penumbra_height(c, s[0], rho)) / sqrt(dot(s + 3, s + 3));
}

static double time_to_edge(const Case *c, const double *s)
{
    double rho = sqrt(s[1] * s[1] + s[2] * s[2]), rho_rate = rho > 0.0 ? (s[1] * s[4] + s[2] * s[5]) / rho : 0.0;
    double out_rate = rho_rate * c->penumbra_cosine + s[3] * c->penumbra_sine;
    double in_rate = rho_rate * c->umbra_cosine - s[3] * c->umbra_sine, time = INFINITY;
    if (out_rate > 0.0)
        time = -penumbra_height(c, s[0], rho) / out_rate;
    if (in_rate < 0.0)
        time = fmin(time, -umbra_height(c, s[0], rho) / in_rate);
    return fmax(time, 0.0);
}

/* Newton's method from the part `high`, which is under the sphere, back to where the curve passes it. */
static double sphere_crossing(const Curve *curve, double radius, double sign, double high)
{
    double low = 0.0, part = high, s[STATE];
    for (int i = 0; i < 60; i++) {
        state_at(curve, part, s);
        double r = sqrt(dot(s, s)), height = sign * (r - radius);
        if (fabs(height) <= 1e-12 * radius)
            break;
        if (height > 0.0)
            low = part;
        else
            high = part;
        part -= height / (sign * dot(s, s + 3) / r * curve->h);
        if (!(part > low && part < high))
            part = 0.5 * (low + high);
    }
    return part;
}

/* Part of the curve, before `high`, where it leaves `zone`: halving, after which the zone beyond is sure. */
static double edge_crossing(const Case *c, const Curve *curve, int zone, double high)
{
    double low = 0.0, s[STATE];
    for (int i = 0; i < 40; i++) {
        double part = 0.5 * (low + high);
        state_at(curve, part, s);
        if (zone_at(c, s) == zone)
            low = part;
        else
            high = part;
    }
    return high;
}

/* Ground and outer sphere: cut the curve and say how the flight stands. */
static inline int spheres(const Case *c, Curve *curve, const double *s, const double *end)
{
    if (dot(end, end) < c->radius * c->radius) {
        curve->flown = sphere_crossing(curve, c->radius, 1.0, 1.0);
        return LANDED;
    }
    if (dot(s, s + 3) < 0.0 && dot(end, end + 3) > 0.0) { /* past the lowest point: was it underground? */
        double low = 0.0, high = 1.0, m[STATE];
        for (int i = 0; i < 40; i++) {
            double part = 0.5 * (low + high);
            state_at(curve, part, m);
            if (dot(m, m + 3) < 0.0)
                low = part;
            else
                high = part;
        }
        if (dot(m, m) < c->radius * c->radius) {
            curve->flown = sphere_crossing(curve, c->radius, 1.0, high);
            return LANDED;
        }
    }
    if (dot(end, end) > c->outer_radius * c->outer_radius) {
        curve->flown = sphere_crossing(curve, c->outer_radius, -1.0, 1.0);
        return CROSSED;
    }
    return FLYING;
}

/* Where the flown part leaves its shadow zone, cut it there; returns the zone beyond, or the same. */
static inline int edges(const Case *c, Curve *curve, int zone, const double *s, const double *end)
{
    double terminator = c->radius * c->penumbra_sine;
    if (zone == LIT && s[0] > terminator && end[0] > terminator)
        return zone;
    for (int i = 1; i <= 2; i++) { /* half-way too, so that a short way through the shadow is seen */
        double part = 0.5 * i * curve->flown, m[STATE];
        state_at(curve, part, m);
        int there = zone_at(c, m);
        if (there != zone) {
            curve->flown = edge_crossing(c, curve, zone, part);
            state_at(curve, curve->flown, m);
            return zone == PENUMBRA ? there : PENUMBRA;
        }
    }
    return zone;
}

static inline int row_of(const Case *c, double sine)
{
    int row = (int)((asin(fmin(1.0, fmax(-1.0, sine))) / M_PI + 0.5) * c->rows);
    return row >= c->rows ? c->rows - 1 : row;
}

static inline int column_of(const Case *c, double x, double y)
{
    int column = (int)((0.5 + atan2(y, x) / (2.0 * M_PI)) * c->columns);
    return column >= c->columns ? 0 : column;
}

static inline int layer_of(const Case *c, double r)
{
    double altitude = r - c->radius;
    if (r >= c->radii[c->layers])
        return -1;
    if (altitude < c->first_altitude)
        return 0;
    int layer = 1 + (int)(log(altitude / c->first_altitude) * c->cells_per_log);
    return layer >= c->layers ? c->layers - 1 : layer;
}

static inline int ground_cell(const Case *c, const double *s, double r)
{
    return row_of(c, s[2] / r) * c->columns + column_of(c, s[0], s[1]);
}

static inline void sample(const Case *c, Tally *tally, int all, const Curve *curve, int zone)
{
    double s[STATE];
    state_at(curve, random01() * curve->flown, s);
    double content = c->weight * exp(-s[6]) * curve->flown * curve->h, r = sqrt(dot(s, s));
    int layer = layer_of(c, r);
    if (layer < 0)
        return;
    int ground = ground_cell(c, s, r), cell = layer * c->rows * c->columns + ground;
    tally->density[cell] += content;
    if (!all)
        return;
    tally->column[ground] += content * c->radius * c->radius / (r * r);
    double sx = c->distance - s[0], far2 = sx * sx + s[1] * s[1] + s[2] * s[2];
    double light = zone == UMBRA ? 0.0 : c->light_distance * c->light_distance / far2;
    if (zone == PENUMBRA)
        light *= visible(c, s[0], s[1], s[2]);
    double receding = (s[1] * s[4] + s[2] * s[5] - sx * (s[3] - c->radial_velocity)) / sqrt(far2);
    tally->ionized[cell] += content * light * c->ionization;
    for (int i = 0; i < LINES; i++)
        tally->emission[i][cell] += content * light * table_value(&c->line[i], c->line[i].g, receding);
}

static inline void book_step(const Case *c, Tally *tally, const Curve *curve)
{
    double a[STATE], m[STATE], b[STATE];
    state_at(curve, 0.0, a);
    state_at(curve, 0.5 * curve->flown, m);
    state_at(curve, curve->flown, b);
    double before = exp(-a[6]), after = exp(-b[6]);
    tally->life += c->weight * curve->flown * curve->h * (before + 4.0 * exp(-m[6]) + after) / 6.0;
    tally->ionized_total += c->weight * (before - after);
}

static void book_end(const Case *c, Tally *tally, int ending, const double *home, const double *s)
{
    double alive = c->weight * exp(-s[6]);
    int start = ground_cell(c, home, c->radius), end = ground_cell(c, s, sqrt(dot(s, s)));
    tally->released[start] += c->weight;
    if (ending == LANDED) {
        tally->landed[end] += alive;
        tally->captured[end] += alive;
        tally->captured_total += alive;
    } else if (ending == CROSSED) {
        tally->escaped[start] += alive;
        tally->directions[end] += alive;
        tally->escaped_total += alive;
    } else if (ending == AGED) {
        tally->aged_total += alive;
    } else {
        tally->unresolved_total += alive;
    }
}

static double first_step(const Case *c, const double *s)
{
    double r = sqrt(dot(s, s)), speed2 = dot(s + 3, s + 3), climb = dot(s, s + 3) / r, pull = c->gm / (r * r);
    double step = c->first_share * pow(c->allowed, 1.0 / 6.0) * r / sqrt(fmax(speed2, pull * r));
    double fall = pull - (speed2 - climb * climb) / r;
    if (climb > 0.0 && fall > 0.0)
        step = fmin(step, 2.2 * climb / fall);
    return step;
}

static int fly(const Case *c, const double *launch, Tally *tally, int mode, double *end_state, double *time,
               long *steps, long *trials)
{
    double s[STATE] = {launch[0], launch[1], launch[2], launch[3], launch[4], launch[5], 0.0};
    double k[7][STATE], end[STATE];
    int zone = zone_at(c, s), standing = FLYING;
    double t = 0.0, next = first_step(c, s), open_step = next;
    if (zone == PENUMBRA)
        next = 0.3 * crossing_time(c, s);
    rates(c, zone, s, k[0]);
    while (standing == FLYING) {
        Curve curve;
        double r = sqrt(dot(s, s)), pull = fabs(k[0][3]) + fabs(k[0][4]) + fabs(k[0][5]);
        double h = fmin(next, r / sqrt(dot(s + 3, s + 3) + pull * r)), change;
        if (zone == PENUMBRA)
            h = fmin(h, fmax(1.01 * time_to_edge(c, s), 0.01 * crossing_time(c, s)));
        int last;
        for (;;) {
            last = h >= c->age_limit - t;
            if (last)
                h = c->age_limit - t;
            ++*trials;
            double error = trial(c, zone, h, s, k, end);
            change = step_change(error);
            if (error <= 1.0)
                break;
            h *= fmin(change, 1.0);
            if (!(h > 1e-13 * t))
                return UNRESOLVED;
        }
        ++*steps;
        make_curve(&curve, h, s, end, k);
        next = h * change;
        standing = spheres(c, &curve, s, end);
        int beyond = edges(c, &curve, zone, s, end);
        if (beyond != zone)
            standing = FLYING;
        else if (standing == FLYING && last)
            standing = AGED;
        if (mode) {
            sample(c, tally, mode == 2, &curve, zone);
            if (mode == 2)
                book_step(c, tally, &curve);
        }
        t += curve.flown * h;
        if (curve.flown == 1.0) {
            memcpy(s, end, sizeof s);
            memcpy(k[0], k[6], sizeof s);
        } else {
            state_at(&curve, curve.flown, s);
        }
        if (beyond != zone) {
            if (beyond == PENUMBRA) {
                open_step = next;
                next = fmin(next, 0.3 * crossing_time(c, s));
            } else {
                next = fmax(next, open_step);
            }
            zone = beyond;
            rates(c, zone, s, k[0]);
        }
    }
    memcpy(end_state, s, sizeof s);
    *time = t;
    return standing;
}

static double *load(const char *path)
{
    FILE *file = fopen(path, "rb");
    if (!file)
        exit(1);
    fseek(file, 0, SEEK_END);
    long size = ftell(file);
    rewind(file);
    double *data = malloc((size_t)size);
    if (!data || fread(data, 1, (size_t)size, file) != (size_t)size)
        exit(1);
    fclose(file);
    return data;
}

/* The numbers of a case in the order in which run.py writes them; returns the launches. */
static const double *read_case(Case *c, const double *p, long *count)
{
    *count = (long)*p++;
    double *numbers[] = {&c->gm, &c->radius, &c->outer_radius, &c->tide_gm, &c->distance, &c->radial_velocity,
                         &c->turning, &c->light_distance, &c->ionization, &c->sun_radius, &c->penumbra_sine,
                         &c->umbra_sine, &c->allowed, &c->first_share, &c->age_limit, &c->weight,
                         &c->first_altitude, &c->cells_per_log};
    for (size_t i = 0; i < sizeof numbers / sizeof *numbers; i++)
        *numbers[i] = *p++;
    c->penumbra_cosine = sqrt(1.0 - c->penumbra_sine * c->penumbra_sine);
    c->umbra_cosine = sqrt(1.0 - c->umbra_sine * c->umbra_sine);
    c->layers = (int)*p++;
    c->rows = (int)*p++;
    c->columns = (int)*p++;
    c->radii = p;
    p += c->layers + 1;
    for (int i = 0; i < LINES; i++) {
        c->line[i].first = *p++;
        c->line[i].per_step = 1.0 / *p++;
        c->line[i].last = (int)*p++ - 1;
        c->line[i].push = p;
        p += c->line[i].last + 1;
        c->line[i].g = p;
        p += c->line[i].last + 1;
    }
    return p;
}

static double *zeros(int n)
{
    double *data = calloc((size_t)n, sizeof *data);
    if (!data)
        exit(1);
    return data;
}

static double processor_time(void)
{
    struct timespec now;
    clock_gettime(CLOCK_PROCESS_CPUTIME_ID, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

int main(int argc, char **argv)
{
    if (argc != 5)
        return 2;
    Case c;
    long count;
    const double *launches = read_case(&c, load(argv[1]), &count);
    int mode = atoi(argv[2]), ground = c.rows * c.columns;
    Tally tally = {.density = zeros(c.layers * ground), .column = zeros(ground), .ionized = zeros(c.layers * ground),
                   .emission = {zeros(c.layers * ground), zeros(c.layers * ground)}, .released = zeros(ground),
                   .landed = zeros(ground), .captured = zeros(ground), .escaped = zeros(ground),
                   .directions = zeros(ground)};
    double *ends = zeros((int)count * ENDS);
    for (int i = 0; i < 4; i++)
        rng_state[i] = 0x9E3779B97F4A7C15u * (uint64_t)(i + 1);
    for (int round = atoi(argv[3]); round > 0; round--) {
        long steps = 0, trials = 0;
        double begin = processor_time();
        for (long i = 0; i < count; i++) {
            double end[STATE], time = 0.0, *out = ends + ENDS * i;
            int ending = fly(&c, launches + 6 * i, &tally, mode, end, &time, &steps, &trials);
            if (mode == 2)
                book_end(&c, &tally, ending, launches + 6 * i, end);
            out[0] = ending;
            out[1] = time;
            memcpy(out + 2, end, 3 * sizeof *end);
            out[5] = exp(-end[6]);
        }
        printf("%.6f %ld %ld\n", processor_time() - begin, steps, trials);
    }
    double sum = 0.0;
    for (int i = 0; i < c.layers * ground; i++)
        sum += tally.density[i] + tally.ionized[i] + tally.emission[0][i] + tally.emission[1][i];
    fprintf(stderr, "%g\n", sum);
    FILE *file = fopen(argv[4], "wb");
    if (!file || fwrite(ends, sizeof *ends, (size_t)count * ENDS, file) != (size_t)count * ENDS)
        return 1;
    return fclose(file) != 0;
}
