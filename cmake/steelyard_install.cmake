# SPDX-License-Identifier: BSL-1.0
include(GNUInstallDirs)
include(CMakePackageConfigHelpers)

set(package_dir "${CMAKE_INSTALL_DATADIR}/cmake/steelyard")
set(pkgconfig_dir "${CMAKE_INSTALL_DATADIR}/pkgconfig")

install(DIRECTORY "${PROJECT_SOURCE_DIR}/include/" DESTINATION "${CMAKE_INSTALL_INCLUDEDIR}" FILES_MATCHING PATTERN "*.hpp")
install(FILES "${PROJECT_SOURCE_DIR}/LICENSE" DESTINATION "${CMAKE_INSTALL_DATADIR}/licenses/steelyard")

target_include_directories(steelyard_core INTERFACE "$<INSTALL_INTERFACE:${CMAKE_INSTALL_INCLUDEDIR}>")

# Two export sets, so that the core can be loaded where Boost and xtensor are absent.
install(TARGETS steelyard_core EXPORT steelyard_core_targets)
install(TARGETS steelyard EXPORT steelyard_targets)
install(EXPORT steelyard_core_targets NAMESPACE steelyard:: DESTINATION "${package_dir}" FILE steelyardCoreTargets.cmake)
install(EXPORT steelyard_targets NAMESPACE steelyard:: DESTINATION "${package_dir}" FILE steelyardTargets.cmake)

configure_package_config_file("${PROJECT_SOURCE_DIR}/cmake/steelyardConfig.cmake.in"
                              "${PROJECT_BINARY_DIR}/steelyardConfig.cmake" INSTALL_DESTINATION "${package_dir}")
write_basic_package_version_file("${PROJECT_BINARY_DIR}/steelyardConfigVersion.cmake" COMPATIBILITY SameMinorVersion
                                 ARCH_INDEPENDENT)
install(FILES "${PROJECT_BINARY_DIR}/steelyardConfig.cmake" "${PROJECT_BINARY_DIR}/steelyardConfigVersion.cmake"
        DESTINATION "${package_dir}")

# pkg-config: the include folder is found from the place of the .pc file, so that the tree may be moved.
file(RELATIVE_PATH pc_prefix "${CMAKE_INSTALL_PREFIX}/${pkgconfig_dir}" "${CMAKE_INSTALL_PREFIX}")
string(REGEX REPLACE "/$" "" pc_prefix "${pc_prefix}")
foreach(pc IN ITEMS steelyard-core steelyard)
  configure_file("${PROJECT_SOURCE_DIR}/cmake/${pc}.pc.in" "${PROJECT_BINARY_DIR}/${pc}.pc" @ONLY)
  install(FILES "${PROJECT_BINARY_DIR}/${pc}.pc" DESTINATION "${pkgconfig_dir}")
endforeach()
