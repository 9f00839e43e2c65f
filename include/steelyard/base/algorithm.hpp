// SPDX-License-Identifier: BSL-1.0
#pragma once

// The classic algorithms. libstdc++ keeps them apart from the range versions,
// which would add 4000 preprocessed lines that nothing here uses.
#if __has_include(<bits/stl_algo.h>)
#include <bits/stl_algo.h>
#else
#include <algorithm>
#endif
