// SPDX-License-Identifier: BSL-1.0
// No include guard on purpose: gives back the names that widths_begin.hpp took in.
#undef STEELYARD_DETAIL_EACH_WIDTH
#undef STEELYARD_DETAIL_INLINE
#if defined(STEELYARD_DETAIL_AVX2)
#undef STEELYARD_DETAIL_AVX2
#undef STEELYARD_DETAIL_AVX512
#undef STEELYARD_DETAIL_POP
#endif
