/* SPDX-License-Identifier: GPL-2.0-or-later */
#ifndef FOREGLOW_C_H
#define FOREGLOW_C_H

#include <stddef.h>

#ifdef __cplusplus
extern "C" {
#endif

/** Returns the version of the library; the text lives as long as the program. */
const char* foreglow_version(void);

/** Makes the maps of a study file, as `foreglow make STUDY --out OUT` does; nothing is printed.
 *  out may be NULL (the study's stem + "-out"); replace is 0 or 1.
 *  On failure a sentence goes to message (up to message_size bytes with the final 0; may be NULL).
 *  Returns 0 done, 1 the work failed, 2 the request was wrong: the command's exit statuses. */
int foreglow_make(const char* study, const char* out, int replace, char* message, size_t message_size);

/** Returns T(nu)/T(nu0) = (nu/nu0)^(index + curvature ln(nu/nu0)), brightness temperature in K_RJ;
 * frequencies in Hz, above 0. */
double foreglow_brightness_ratio(double frequency_hz, double reference_hz, double index, double curvature);

#ifdef __cplusplus
}
#endif

#endif
