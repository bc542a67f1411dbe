// The standard work of standard_work.py in plain C: the speed a capable engineer gets without tricks.
//
// Every blade element is one equation in the inflow angle, bracketed between the rotor plane and the shaft and closed
// with the method of T. R. Chandrupatla, "A new hybrid quadratic/bisection algorithm for finding the zero of a
// nonlinear function without using derivatives", Advances in Engineering Software 28 (1997), pp. 145-149.
// No start values carried over, no approximated functions, no hand-written vector code.
//
//     cc -O3 -march=native -ffast-math -o yardstick yardstick.c -lm && ./yardstick [tables]
//
// Prints one JSON object; "checksum" is the sum of CT + CQ over a table, averaged over the tables.
#define _POSIX_C_SOURCE 199309L
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <time.h>

enum { ANGLES = 721, REYNOLDS_NUMBERS = 8, STATIONS = 40, ADVANCE_RATIOS = 31, ITERATIONS = 60 };

static const double pi = 3.14159265358979323846;
static const double angle_tolerance = 2e-10; // rad
static const double first_ln_reynolds = 9.2, ln_reynolds_step = 0.6;

struct coefficients {
    double lift, drag;
};

struct annulus {
    double axial, circumferential; // undisturbed velocities, m/s
    double solidity;
    double tip_exponent, root_exponent; // of Prandtl's factor, to be divided by sin(phi)
    double blade_angle;
    double ln_reynolds;
};

struct answer {
    double normal, tangential, loss;
};

static struct coefficients polar[REYNOLDS_NUMBERS][ANGLES];
static long calls;

static void fill_polars(void) {
    for (int column = 0; column < ANGLES; column++) {
        const double alpha = (0.5 * column - 180.0) * pi / 180.0;
        const double attached = 1.0 / (1.0 + exp(40.0 * (fabs(alpha) - 0.24)));
        const double separated = 1.0 - attached;
        for (int row = 0; row < REYNOLDS_NUMBERS; row++) {
            const double friction = 0.012 + 0.01 * (REYNOLDS_NUMBERS - 1 - row) / REYNOLDS_NUMBERS;
            struct coefficients *cell = &polar[row][column];
            cell->lift = 6.0 * (alpha + 0.06) * attached + 1.1 * sin(2.0 * alpha) * separated;
            cell->drag = (friction + 0.3 * alpha * alpha) * attached
                       + (0.02 + 1.9 * pow(sin(alpha), 2)) * separated;
        }
    }
}

static double within(double value, double largest) { return fmin(fmax(value, 0.0), largest); }

static struct coefficients look_up(double alpha, double ln_reynolds) {
    const double across = within(360.0 + alpha * (360.0 / pi), ANGLES - 1.0001);
    const double along = within((ln_reynolds - first_ln_reynolds) / ln_reynolds_step, REYNOLDS_NUMBERS - 1.0001);
    const int column = (int)across, row = (int)along;
    const double right = across - column, upper = along - row;
    const struct coefficients *below = &polar[row][column], *above = &polar[row + 1][column];
    const double w00 = (1.0 - right) * (1.0 - upper), w10 = right * (1.0 - upper);
    const double w01 = (1.0 - right) * upper, w11 = right * upper;
    return (struct coefficients){
        w00 * below[0].lift + w10 * below[1].lift + w01 * above[0].lift + w11 * above[1].lift,
        w00 * below[0].drag + w10 * below[1].drag + w01 * above[0].drag + w11 * above[1].drag,
    };
}

// Momentum of the stream tube less the force of the blades, in the form that stays finite standing still.
static double imbalance(const struct annulus *tube, double phi, struct answer *forces) {
    const double sine = sin(phi), cosine = cos(phi);
    const double per_sine = 1.0 / fmax(fabs(sine), 1e-9);
    const struct coefficients section = look_up(tube->blade_angle - phi, tube->ln_reynolds);
    const double at_tip = acos(exp(-tube->tip_exponent * per_sine));
    const double at_root = acos(exp(-tube->root_exponent * per_sine));
    forces->loss = at_tip * at_root * (4.0 / (pi * pi));
    forces->normal = section.lift * cosine - section.drag * sine;
    forces->tangential = section.lift * sine + section.drag * cosine;
    const double load = 0.25 * tube->solidity / forces->loss;
    calls++;
    return tube->axial * (sine * cosine + load * forces->tangential)
         - tube->circumferential * (sine * sine - load * forces->normal);
}

static double inflow_angle(const struct annulus *tube, struct answer *forces) {
    double newest = 0.5 * pi, opposite = 1e-6; // the two ends of the bracket
    double at_newest = imbalance(tube, newest, forces), at_opposite = imbalance(tube, opposite, forces);
    if (at_newest * at_opposite > 0.0) return NAN;
    double share = 0.5; // of the way from the newest to the opposite end
    for (int left = ITERATIONS; left > 0; left--) {
        const double phi = newest + share * (opposite - newest);
        const double value = imbalance(tube, phi, forces);
        double dropped, at_dropped;
        if (value * at_newest > 0.0) {
            dropped = newest, at_dropped = at_newest;
        } else {
            dropped = opposite, at_dropped = at_opposite;
            opposite = newest, at_opposite = at_newest;
        }
        newest = phi, at_newest = value;
        const double smallest_share = angle_tolerance / fabs(opposite - newest);
        if (value == 0.0 || smallest_share > 0.5) break;

        const double x = (newest - opposite) / (dropped - opposite);
        const double y = (at_newest - at_opposite) / (at_dropped - at_opposite);
        share = 0.5;
        if (y * y < x && (1.0 - y) * (1.0 - y) < 1.0 - x) { // inverse quadratic interpolation is safe here
            const double first = at_newest / (at_opposite - at_newest) * (at_dropped / (at_opposite - at_dropped));
            const double second = at_newest / (at_dropped - at_newest) * (at_opposite / (at_dropped - at_opposite));
            share = first + second * (dropped - newest) / (opposite - newest);
        }
        share = fmin(fmax(share, smallest_share), 1.0 - smallest_share);
    }
    return newest;
}

// CT + CQ of the whole blade at one advance ratio.
static double solve_point(double advance_ratio, double pitch) {
    const double blades = 2.0, tip = 0.15, root = 0.1 * tip, diameter = 2.0 * tip;
    const double turns = 100.0, spin = 2.0 * pi * turns, density = 1.225, viscosity = 1.8e-5;
    const double width = 0.85 * tip / STATIONS;
    double thrust = 0.0, torque = 0.0;
    for (int station = 0; station < STATIONS; station++) {
        const double radius = 0.15 * tip + (station + 0.5) * width;
        const double from_widest = (radius / tip - 0.35) / 0.65;
        const double chord = 0.18 * tip * (1.0 - 0.6 * from_widest * from_widest);
        const struct annulus tube = {
            .axial = advance_ratio * turns * diameter,
            .circumferential = spin * radius,
            .solidity = blades * chord / (2.0 * pi * radius),
            .tip_exponent = 0.5 * blades * (tip - radius) / radius,
            .root_exponent = 0.5 * blades * (radius - root) / radius,
            .blade_angle = atan(pitch / (2.0 * pi * radius)),
            .ln_reynolds = log(density * spin * radius * chord / viscosity),
        };
        struct answer forces;
        const double phi = inflow_angle(&tube, &forces);
        const double swirl = 0.25 * tube.solidity * forces.tangential / (forces.loss * sin(phi));
        const double speed = tube.circumferential / (cos(phi) + swirl);
        const double pressure_force = 0.5 * density * speed * speed * blades * chord * width;
        thrust += pressure_force * forces.normal;
        torque += pressure_force * forces.tangential * radius;
    }
    const double scale = density * turns * turns * pow(diameter, 4);
    return thrust / scale + torque / (scale * diameter);
}

static double seconds(void) {
    struct timespec now;
    clock_gettime(CLOCK_MONOTONIC, &now);
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

int main(int count, char **arguments) {
    const int tables = count > 1 ? atoi(arguments[1]) : 400;
    if (tables < 1) {
        fprintf(stderr, "usage: yardstick [tables], a positive number\n");
        return 2;
    }
    fill_polars();
    double sum = 0.0;
    const double start = seconds();
    for (int k = 0; k < tables; k++) {
        const double pitch = 0.1524 * (1.0 + 1e-6 * k); // no two tables alike, so that none can be left out
        for (int step = 0; step < ADVANCE_RATIOS; step++) sum += solve_point(0.9 * step / (ADVANCE_RATIOS - 1), pitch);
    }
    const double elapsed = seconds() - start;
    const double elements = (double)tables * ADVANCE_RATIOS * STATIONS;
    printf("{\"nanoseconds_per_element\": %.1f, \"tables_per_second\": %.1f, \"calls_per_element\": %.2f, "
           "\"checksum\": %.6f}\n",
           1e9 * elapsed / elements, tables / elapsed, (double)calls / elements, sum / tables);
    return 0;
}
