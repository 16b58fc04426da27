/* Materials against published tables. */
#include "phantoms/material.h"
#include "tests/near.h"

#include <string.h>

#define NIST "NIST, Hubbell and Seltzer (1995), NISTIR 5632, table 3 or 4"
enum { ENERGIES = 8, MOST_ELEMENTS = 9 };
static const double energy_kev[ENERGIES] = {20, 30, 40, 50, 60, 80, 100, 150};

/** A material by formula or by NIST's composition, its density [g/cm3] and mass attenuation [cm2/g]. */
typedef struct {
    const char *name, *formula;
    int z[MOST_ELEMENTS];
    double fraction[MOST_ELEMENTS], density, mass[ENERGIES];
} row;
/* Mass attenuation: NIST tables 3 and 4, polycarbonate by the mixture rule from table 3. Densities: NIST tables 1 and
 * 2, from memory. Compositions: ICRU report 44 as table 2 of NIST gives it. */
static const row table[] = {
    {"water", "H2O", {0}, {0}, 1, {0.8096, 0.3756, 0.2683, 0.2269, 0.2059, 0.1837, 0.1707, 0.1505}},
    {"acrylic", "C5H8O2", {0}, {0}, 1.19, {0.5714, 0.3032, 0.2350, 0.2074, 0.1924, 0.1751, 0.1641, 0.1456}},
    {"polyethylene", "C2H4", {0}, {0}, 0.93, {0.4315, 0.2706, 0.2275, 0.2084, 0.1970, 0.1823, 0.1719, 0.1534}},
    {"polystyrene", "C8H8", {0}, {0}, 1.06, {0.4363, 0.2640, 0.2183, 0.1986, 0.1870, 0.1725, 0.1624, 0.1448}},
    {"ptfe", "C2F4", {0}, {0}, 2.25, {0.9667, 0.4025, 0.2647, 0.2132, 0.1880, 0.1632, 0.1500, 0.1310}},
    {"polycarbonate", "C16H14O3", {0}, {0}, 1.2, {0.5178, 0.2848, 0.2249, 0.2003, 0.1866, 0.1705, 0.1600, 0.1422}},
    {"cortical bone",
     NULL,
     {1, 6, 7, 8, 11, 12, 15, 16, 20},
     {.034, .155, .042, .435, .001, .002, .103, .003, .225},
     1.92,
     {4.001, 1.331, 0.6655, 0.4242, 0.3148, 0.2229, 0.1855, 0.1480}},
    {"adipose",
     NULL,
     {1, 6, 7, 8, 11, 16, 17},
     {.114, .598, .007, .278, .001, .001, .001},
     0.95,
     {0.5677, 0.3063, 0.2396, 0.2123, 0.1974, 0.1800, 0.1688, 0.1500}},
    {"soft tissue",
     NULL,
     {1, 6, 7, 8, 11, 15, 16, 17, 19},
     {.102, .143, .034, .708, .002, .003, .003, .002, .003},
     1.06,
     {0.8230, 0.3790, 0.2688, 0.2264, 0.2048, 0.1823, 0.1693, 0.1492}},
    {"dry air",
     NULL,
     {6, 7, 8, 18},
     {.000124, .755268, .231781, .012827},
     1.205e-3,
     {0.7779, 0.3538, 0.2485, 0.2080, 0.1875, 0.1662, 0.1541, 0.1356}},
    {"aluminium", "Al", {0}, {0}, 2.699, {3.441, 1.128, 0.5685, 0.3681, 0.2778, 0.2018, 0.1704, 0.1378}},
    {"titanium", "Ti", {0}, {0}, 4.54, {15.85, 4.972, 2.214, 1.213, 0.7661, 0.4052, 0.2721, 0.1649}},
    {"copper", "Cu", {0}, {0}, 8.96, {33.79, 10.92, 4.862, 2.613, 1.593, 0.7630, 0.4584, 0.2217}},
    {"iodine", "I", {0}, {0}, 4.93, {25.43, 8.561, 22.10, 12.32, 7.579, 3.510, 1.942, 0.6978}},
    {"barium", "Ba", {0}, {0}, 3.5, {29.38, 9.904, 24.57, 13.79, 8.511, 3.963, 2.196, 0.7828}},
    {"tungsten", "W", {0}, {0}, 19.3, {65.73, 22.73, 10.67, 5.949, 3.713, 7.810, 4.438, 1.581}},
    {"lead", "Pb", {0}, {0}, 11.35, {86.36, 30.32, 14.36, 8.041, 5.021, 2.419, 5.549, 2.014}},
    {"hydrogen", "H", {0}, {0}, 1, {0.3695, 0.3570, 0.3458, 0.3355, 0.3260, 0.3091, 0.2944, 0.2651}},
    {"carbon", "C", {0}, {0}, 1.7, {0.4420, 0.2562, 0.2076, 0.1871, 0.1753, 0.1610, 0.1514, 0.1347}},
    {"oxygen", "O", {0}, {0}, 1, {0.8651, 0.3779, 0.2585, 0.2132, 0.1907, 0.1678, 0.1551, 0.1361}},
};
enum { ROWS = sizeof table / sizeof *table };

/** The row as the program's own material; composed ones borrow the table's arrays. */
static tg_material material(const row *r, int z[MOST_ELEMENTS], double fraction[MOST_ELEMENTS])
{
    tg_error e = {0};
    tg_material m = {.density_g_cm3 = r->density, .mu_per_mm = NAN, .hu = NAN};
    if (r->formula) {
        CK_OK(tg_material_formula(r->formula, r->density, "phantom.yaml", 3, &m, &e));
        return m;
    }
    memcpy(z, r->z, sizeof r->z);
    memcpy(fraction, r->fraction, sizeof r->fraction);
    while (m.n < MOST_ELEMENTS && z[m.n])
        m.n++;
    m.z = z;
    m.fraction = fraction;
    return m;
}

static double mu(const char *name, double kev)
{
    tg_error e = {0};
    int z[MOST_ELEMENTS];
    double fraction[MOST_ELEMENTS], value = NAN;
    for (int i = 0; i < ROWS; i++)
        if (!strcmp(table[i].name, name)) {
            tg_material m = material(&table[i], z, fraction);
            CK_OK(tg_material_mu(&m, kev, &value, &e));
            if (table[i].formula) tg_material_free(&m);
        }
    return value;
}

START_TEST(mass_attenuation)
{
    for (int i = 0; i < ROWS; i++)
        for (int k = 0; k < ENERGIES; k++) /* four digits: at most 0.05 %, and as much for the spline */
            CK_NEAR(mu(table[i].name, energy_kev[k]) * 10 / table[i].density, table[i].mass[k], 1e-3, 0, NIST);
    CK_NEAR(mu("water", 10), 0.5329, 1e-3, 0, NIST);
    CK_NEAR(mu("tungsten", 200), 0.7844 * 1.93, 1e-3, 0, NIST);
}
END_TEST

START_TEST(half_value_layers)
{
    /* ln 2 / mu from the mass attenuation and densities above [cm]; the fifth digit is the table's own rounding */
    static const struct {
        const char *name;
        double hvl_cm[4]; /* 30, 60, 80, 100 keV */
    } layer[] = {
        {"water", {1.8454, 3.3664, 3.7733, 4.0606}},          {"acrylic", {1.9211, 3.0274, 3.3265, 3.5495}},
        {"aluminium", {0.22767, 0.92447, 1.2726, 1.5071}},    {"copper", {0.0070842, 0.048562, 0.10139, 0.16876}},
        {"cortical bone", {0.27124, 1.1468, 1.6196, 1.9462}}, {"ptfe", {0.7654, 1.6386, 1.8877, 2.0538}},
    };
    static const double kev[4] = {30, 60, 80, 100};
    for (size_t i = 0; i < sizeof layer / sizeof *layer; i++)
        for (int k = 0; k < 4; k++)
            CK_NEAR(log(2) / mu(layer[i].name, kev[k]) / 10, layer[i].hvl_cm[k], 1e-3, 0, "ln 2 / mu of " NIST);
}
END_TEST

START_TEST(ct_numbers)
{
    /* 1000 (mu - mu_water) / mu_water by xraylib's coefficients from a separate computation, one decimal given; water
     * by formula there, by NIST's composition here: 0.03 % of the value + 1000 */
    static const struct {
        const char *name;
        double hu[3]; /* 50, 70, 100 keV */
    } number[] = {
        {"acrylic", {87.6, 126.1, 143.7}},       {"polyethylene", {-145.8, -89.5, -63.5}},
        {"polystyrene", {-72.5, -17.0, 8.5}},    {"ptfe", {1113.4, 1020.1, 977.0}},
        {"polycarbonate", {58.9, 104.0, 124.6}}, {"cortical bone", {2588.7, 1558.7, 1086.2}},
        {"adipose", {-111.3, -76.6, -60.6}},     {"soft tissue", {57.3, 53.0, 51.0}},
        {"dry air", {-998.9, -998.9, -998.9}},   {"aluminium", {3378.0, 2219.9, 1693.7}},
    };
    static const double kev[3] = {50, 70, 100};
    for (size_t i = 0; i < sizeof number / sizeof *number; i++)
        for (int k = 0; k < 3; k++) {
            tg_error e = {0};
            double water;
            CK_OK(tg_water_mu(kev[k], &water, &e));
            CK_NEAR(1000 * (mu(number[i].name, kev[k]) - water) / water, number[i].hu[k], 0,
                    0.05 + 3e-4 * (1000 + number[i].hu[k]), "monoenergetic CT number, separate computation");
        }
}
END_TEST

START_TEST(composition)
{
    static const struct {
        const char *formula, *compound; /* either */
        int z[4];
        double fraction[4], density;
        const char *source;
    } given[] = {
        {"C5H8O2", NULL, {1, 6, 8}, {.080541, .599846, .319613}, 1.19, "NIST table 2, from memory"},
        {"CH2", NULL, {1, 6}, {.143716, .856284}, 0.93, "NIST table 2, from memory"},
        {"(CH)8", NULL, {1, 6}, {.077421, .922579}, 1.06, "NIST table 2, from memory"},
        {"CF2", NULL, {6, 9}, {.240183, .759818}, 2.25, "NIST table 2, from memory"},
        {"C1.5O0.75H3", "Polyoxymethylene", {1, 6, 8}, {.067135, .400017, .532848}, 1.425, "NIST STAR list"},
        {NULL, "Water, Liquid", {1, 8}, {.111894, .888106}, 1, "NIST STAR list"},
        {NULL,
         "air, dry (near sea level)",
         {6, 7, 8, 18},
         {.000124, .755267, .231781, .012827},
         1.20479e-3,
         "NIST STAR list"},
    };
    for (size_t i = 0; i < sizeof given / sizeof *given; i++) {
        tg_error e = {0};
        tg_material m = {0};
        const char *formula = given[i].formula;
        if (given[i].compound) {
            CK_OK(tg_material_compound(given[i].compound, NAN, NULL, 0, &m, &e));
            CK_NEAR(m.density_g_cm3, given[i].density, 1e-3, 0, given[i].source);
            formula = NULL;
        } else {
            CK_OK(tg_material_formula(formula, given[i].density, NULL, 0, &m, &e));
        }
        double sum = 0;
        for (int k = 0; k < m.n; k++) {
            ck_assert_int_eq(m.z[k], given[i].z[k]);
            CK_NEAR(m.fraction[k], given[i].fraction[k], 3e-3, 0,
                    given[i].source); /* atomic weights of 3 to 4 digits */
            sum += m.fraction[k];
        }
        CK_NEAR(sum, 1, 0, 1e-5, "mass fractions add up");
        tg_material_free(&m);
    }
}
END_TEST

START_TEST(nominal_values)
{
    tg_error e = {0};
    double value, water;
    const tg_material plain = {.mu_per_mm = 0.032, .hu = NAN}, hu = {.mu_per_mm = NAN, .hu = 300};
    CK_OK(tg_material_mu(&plain, 61, &value, &e));
    CK_NEAR(value, 0.032, 0, 0, "plain mu");
    for (double kev = 20; kev < 150; kev += 37) {
        CK_OK(tg_water_mu(kev, &water, &e));
        CK_OK(tg_material_mu(&hu, kev, &value, &e));
        CK_NEAR(value, 1.3 * water, 1e-15, 0, "definition of CT numbers");
    }
    ck_assert_int_eq(tg_material_mu(&hu, 0.5, &value, &e), TG_INPUT);
    ck_assert_int_eq(tg_material_mu(&hu, NAN, &value, &e), TG_INPUT);
    const int z[] = {150};
    tg_material unknown = {.n = 1, .density_g_cm3 = 1, .mu_per_mm = NAN, .hu = NAN};
    int own_z[1] = {z[0]};
    double fraction[1] = {1};
    unknown.z = own_z;
    unknown.fraction = fraction;
    ck_assert_int_eq(tg_material_mu(&unknown, 50, &value, &e), TG_INPUT);
}
END_TEST

START_TEST(refusals)
{
    static const char *bad[] = {"",       "c",
                                "Xx2",    "Es",
                                "C2F4)",  "(C2F4",
                                "C()",    "C0",
                                "2C",     "C2.",
                                "C2.5.1", "C-1",
                                "C 2",    "(2C)",
                                "C1e3",   "C0x1",
                                "()",     "H2O\n",
                                "C\xc3",  "((C)))",
                                "C,H",    "C9999999999999999999999999999999999999x"};
    for (size_t i = 0; i < sizeof bad / sizeof *bad; i++) {
        tg_error e = {0};
        tg_material m = {0};
        ck_assert_msg(tg_material_formula(bad[i], 1, "p.yaml", 7, &m, &e) == TG_INPUT, "'%s' is taken", bad[i]);
        ck_assert_int_eq(e.message[0].line, 7);
        ck_assert_ptr_null(m.z);
    }
    static const struct {
        const char *compound, *hint;
    } near[] = {{"water", "Water, Liquid"},
                {"Polyoxymethilene", "Polyoxymethylene"},
                {"Carbon dioxid", "Carbon Dioxide"},
                {"qqqqqqqqqqqq", "formula and density"},
                {"", "formula and density"}};
    for (size_t i = 0; i < sizeof near / sizeof *near; i++) {
        tg_error e = {0};
        tg_material m = {0};
        ck_assert_int_eq(tg_material_compound(near[i].compound, NAN, "p.yaml", 7, &m, &e), TG_INPUT);
        ck_assert_msg(strstr(e.message[0].what, near[i].hint), "%s", e.message[0].what);
    }
}
END_TEST

Suite *suite_material(void);
Suite *suite_material(void)
{
    SUITE_BEGIN("material", 20);
    tcase_add_test(tcase, mass_attenuation);
    tcase_add_test(tcase, half_value_layers);
    tcase_add_test(tcase, ct_numbers);
    tcase_add_test(tcase, composition);
    tcase_add_test(tcase, nominal_values);
    tcase_add_test(tcase, refusals);
    return suite;
}
