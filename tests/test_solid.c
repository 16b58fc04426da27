/* The interval of a ray in every solid against closed forms, whatever its place and tilt. */
#include "phantoms/solid.h"
#include "tests/near.h"

/* 1e-6 is asked; what the arithmetic gives is limited by positions of 500 mm in double: 6e-14 mm each. */
#define TOLERANCE 1e-10

static const double origin[3] = {0, 0, 0}, far_away[3] = {-412.5, 233.25, 57.125};

static tg_solid make(tg_shape shape, double a, double b, double c)
{
    tg_solid s = {.shape = shape, .half_mm = {a, b, c}};
    tg_solid_turn(&s, (const double[3]){0, 0, 1}, 0);
    return s;
}

/** Chord of a ray that is given in the solid's own axes, with the solid anywhere. @return 0 where it misses */
static double chord(tg_solid s, const double p[3], const double d[3])
{
    double world_p[3], world_d[3], t[2];
    const double n = sqrt(d[0] * d[0] + d[1] * d[1] + d[2] * d[2]);
    for (int i = 0; i < 3; i++) {
        world_d[i] = (s.turn[0][i] * d[0] + s.turn[1][i] * d[1] + s.turn[2][i] * d[2]) / n;
        world_p[i] = s.centre_mm[i] + s.turn[0][i] * p[0] + s.turn[1][i] * p[1] + s.turn[2][i] * p[2];
    }
    for (int i = 0; i < 3; i++)
        world_p[i] -= 541.0 * world_d[i]; /* from the source */
    if (!tg_solid_interval(&s, world_p, world_d, t)) return 0;
    for (int end = 0; end < 2;
         end++) { /* both ends lie on the surface: a little inwards is in, a little outwards out */
        const double in = t[end] + (end ? -1 : 1) * 1e-9, out = t[end] - (end ? -1 : 1) * 1e-9;
        double at[2][3];
        for (int i = 0; i < 3; i++) {
            at[0][i] = world_p[i] + in * world_d[i];
            at[1][i] = world_p[i] + out * world_d[i];
        }
        if (t[1] - t[0] > 1e-6) ck_assert(tg_solid_holds(&s, at[0]));
        ck_assert(!tg_solid_holds(&s, at[1]));
    }
    return t[1] - t[0];
}

/** The places and tilts that every check goes through. */
static tg_solid placed(tg_solid s, int pose)
{
    static const double axis[][3] = {{0, 0, 1}, {1, 0, 0}, {0.3, -0.7, 0.2}, {0, 1, 1e-9}, {-2, -2, -5}};
    static const double turn[] = {0, 0.4, -1.1, 2.9, 1.5};
    tg_solid_turn(&s, axis[pose % 5], turn[pose % 5]);
    for (int i = 0; i < 3; i++)
        s.centre_mm[i] = pose % 2 ? far_away[i] : origin[i];
    return s;
}
enum { POSES = 10 };

#define CHORD(solid, p, d, want, what) \
    for (int pose_ = 0; pose_ < POSES; pose_++) \
    CK_NEAR(chord(placed((solid), pose_ % 5 + (pose_ > 4) * 5), (p), (d)), (want), 0, TOLERANCE *fmax(1, (want)), \
            what " (closed form)")
#define V(x, y, z) ((const double[3]){(x), (y), (z)})

START_TEST(turn_is_a_rotation)
{
    for (int pose = 0; pose < 5; pose++) {
        const tg_solid s = placed(make(TG_SOLID_BOX, 1, 1, 1), pose);
        for (int i = 0; i < 3; i++)
            for (int j = 0; j < 3; j++) {
                double dot = 0;
                for (int k = 0; k < 3; k++)
                    dot += s.turn[i][k] * s.turn[j][k];
                CK_NEAR(dot, i == j, 0, 1e-14, "orthonormal axes");
            }
        CK_NEAR(s.turn[0][1] * s.turn[1][2] - s.turn[0][2] * s.turn[1][1], s.turn[2][0], 0, 1e-14, "right-handed");
    }
    tg_solid s = make(TG_SOLID_BOX, 1, 1, 1);
    CK_NEAR(s.turn[0][0], 1, 0, 0, "own x is the world x for an upright solid");
    tg_solid_turn(&s, V(0, 0, 2), acos(-1) / 6); /* 30 degrees counter-clockwise seen from +z */
    CK_NEAR(s.turn[0][0], sqrt(0.75), 0, 1e-15, "turned own x");
    CK_NEAR(s.turn[0][1], 0.5, 0, 1e-15, "turned own x");
}
END_TEST

START_TEST(cylinder)
{
    const tg_solid s = make(TG_CYLINDER, 8, 8, 30);
    for (int k = 0; k < 40; k++) {
        const double b = -8.5 + k * 0.43, slope = -1 + 0.07 * k;
        const double want = fabs(b) < 8 ? 2 * sqrt(64 - b * b) * sqrt(1 + slope * slope) : 0;
        if (8 * fabs(slope) < 30) CHORD(s, V(b, 0, 0), V(0, 1, slope), want, "cylinder across");
    }
    CHORD(s, V(3, 2, 0), V(0, 0, -1), 60, "cylinder along its axis");
    CHORD(s, V(8.001, 0, 0), V(0, 0, 1), 0, "cylinder alongside");
    CHORD(s, V(0, 0, 0), V(1e-9, 0, 1), 60, "cylinder almost along its axis");
    /* in through the end at z = 30, out through the mantle: x = 8 at z = 22 */
    CHORD(s, V(0, 0, 30), V(1, 0, -1), 8 * sqrt(2), "cylinder through end and mantle");
    double t[2];
    ck_assert(!tg_solid_interval(&s, V(8, 0, 0), V(0, 1, 0), t)); /* touched only */
}
END_TEST

START_TEST(thin_wire)
{
    const double r = 0.01;
    const tg_solid s = make(TG_CYLINDER, r, r, 30);
    for (int k = 0; k < 20; k++) { /* 541 mm away: 1e-13 mm of 0.01 mm, relative to what the offset leaves */
        const double b = r * (-0.95 + 0.1 * k), want = 2 * sqrt((r - b) * (r + b));
        for (int pose = 0; pose < POSES; pose++)
            CK_NEAR(chord(placed(s, pose), V(b, 0, 29), V(0, 1, 0)), want, 1e-8, 0, "wire of 0.02 mm (closed form)");
        CK_NEAR(chord(placed(s, 2), V(b, 0, 20), V(0, 1, 40)), want * hypot(1, 40), 1e-8, 0, "wire, steep ray");
    }
}
END_TEST

START_TEST(round_ones)
{
    const tg_solid sphere = make(TG_SPHERE, 5, 5, 5), egg = make(TG_ELLIPSOID, 3, 5, 7),
                   pipe = make(TG_ELLIPTIC_CYLINDER, 3, 5, 20);
    for (int k = 0; k < 30; k++) {
        const double b = -5.5 + 0.37 * k;
        CHORD(sphere, V(b, 0, 0), V(0, 1, 0), fabs(b) < 5 ? 2 * sqrt(25 - b * b) : 0, "sphere");
        CHORD(sphere, V(0.6 * b, -0.8 * b, 0), V(0.8 * 3, 0.6 * 3, 4), fabs(b) < 5 ? 2 * sqrt(25 - b * b) : 0,
              "sphere");
        const double w = 1 - b * b / 25;
        CHORD(egg, V(0, b, 0), V(1, 0, 0), w > 0 ? 6 * sqrt(w) : 0, "ellipsoid along x");
        CHORD(egg, V(0, b, 0), V(0, 0, 1), w > 0 ? 14 * sqrt(w) : 0, "ellipsoid along z");
        CHORD(pipe, V(0, b, 3), V(1, 0, 0), w > 0 ? 6 * sqrt(w) : 0, "elliptic cylinder along x");
        CHORD(pipe, V(0, b, 3), V(0, 0, 1), w > 0 ? 40 : 0, "elliptic cylinder along z");
    }
    /* through the middle along u: 2 / sqrt(sum (u_i / half_i)^2) */
    CHORD(egg, V(0, 0, 0), V(1, 1, 1), 2 * sqrt(3) / sqrt(1. / 9 + 1. / 25 + 1. / 49), "ellipsoid, diagonal");
    CHORD(pipe, V(0, 0, 0), V(1, 1, 0), 2 * sqrt(2) / sqrt(1. / 9 + 1. / 25), "elliptic cylinder, diagonal");
}
END_TEST

START_TEST(flat_ones)
{
    const tg_solid box = make(TG_SOLID_BOX, 2, 3, 5), wedge = make(TG_WEDGE, 4, 3, 2);
    CHORD(box, V(0.3, 0.7, 0), V(0, 0, 1), 10, "box along z");
    CHORD(box, V(0, 0, 0), V(2, 3, 5), 2 * sqrt(38), "box, space diagonal");
    CHORD(box, V(0, 0, 0), V(1, 1, 0), 4 * sqrt(2), "box, across");
    CHORD(box, V(1.5, 2, 0), V(1, -1, 0), 1.5 * sqrt(2), "box, a corner cut");
    CHORD(box, V(2.5, 0, 0), V(0, 1, 0), 0, "box, beside");
    CHORD(wedge, V(1, 0, 0), V(0, 0, 1), 1.5, "wedge upright: from -2 up to -1/2");
    CHORD(wedge, V(0, 0, -1), V(1, 0, 0), 6, "wedge along x: from -4 to 2");
    CHORD(wedge, V(0, 0, -1), V(0, 1, 0), 6, "wedge along y");
    CHORD(wedge, V(0, 0, 0.5), V(2, 0, -1), 0, "wedge, along its slope but above");
    CHORD(wedge, V(0, 0, -0.5), V(2, 0, -1), 3.5 * sqrt(5), "wedge, along its slope");
    /* a plate of 0.05 mm: in through one face, out through the other */
    CHORD(make(TG_SOLID_BOX, 20, 20, 0.025), V(0, 0, 0), V(3, 0, 4), 0.05 * 5 / 4, "foil");
    /* a ray in the face that two boxes share belongs to exactly one of them */
    tg_solid left = box, right = box;
    left.centre_mm[0] = -2;
    right.centre_mm[0] = 2;
    double t[2];
    ck_assert_int_eq(tg_solid_interval(&left, V(0, -9, 0), V(0, 1, 0), t) +
                         tg_solid_interval(&right, V(0, -9, 0), V(0, 1, 0), t),
                     1);
}
END_TEST

START_TEST(cone)
{
    tg_solid s = make(TG_CONE, 10, 10, 10); /* radius 10 at z = -10, 10 taper at z = 10 */
    for (int k = 0; k < 10; k++) {
        s.taper = k / 5.0; /* from a tip over a cylinder to a funnel */
        for (int j = 0; j < 9; j++) {
            const double z = -9 + 2.1 * j, r = 10 * (1 + (s.taper - 1) * (z + 10) / 20);
            CHORD(s, V(0.3 * r, 0, z), V(0, 1, 0), 2 * r * sqrt(0.91), "cone across");
        }
        const double x = 10 * (1 + s.taper) / 2; /* its radius at z = 0 */
        if (k != 5) CHORD(s, V(x, 0, 0), V(0, 0, 1), 10, "cone, half way along its axis");
        CHORD(s, V(0, 0, 0), V(0, 0, 1), 20, "cone along its axis");
        /* parallel to the mantle, from the axis at the lower end: it stays inside until the upper end when
         * taper >= 1; else until the axis' other side, where radius and distance add up to 10 */
        const double slope = (s.taper - 1) / 2; /* dr / dz */
        const double top = s.taper >= 1 ? 20 : fmin(20, 10 / (-2 * slope));
        CHORD(s, V(0, 0, -10), V(slope, 0, 1), top * sqrt(1 + slope * slope), "cone, parallel to its mantle");
    }
    s.taper = 0; /* past the tip there is nothing, however the mirrored nappe may look */
    CHORD(s, V(0, 0, 11), V(0, 1, 0), 0, "cone, above its tip");
    CHORD(s, V(0, 0, 10), V(0.1, 0, 1), 20 * sqrt(1.01), "cone through its tip");
    CHORD(s, V(0, 0, 10), V(1, 0, 0), 0, "cone, touched at its tip");
}
END_TEST

Suite *suite_solid(void);
Suite *suite_solid(void)
{
    SUITE_BEGIN("solid", 20);
    tcase_add_test(tcase, turn_is_a_rotation);
    tcase_add_test(tcase, cylinder);
    tcase_add_test(tcase, thin_wire);
    tcase_add_test(tcase, round_ones);
    tcase_add_test(tcase, flat_ones);
    tcase_add_test(tcase, cone);
    return suite;
}
