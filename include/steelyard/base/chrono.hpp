// SPDX-License-Identifier: BSL-1.0
#pragma once

// Durations and the steady clock. libstdc++ keeps them apart from calendars and
// time zones, which would add 3700 preprocessed lines that nothing here uses.
#if __has_include(<bits/chrono.h>)
#include <bits/chrono.h>
#else
#include <chrono>
#endif
