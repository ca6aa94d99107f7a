# Compiler options of every target: strict warnings as errors, and arithmetic that no compiler may contract or reorder.
add_library(ballast_flags INTERFACE)
target_compile_definitions(ballast_flags INTERFACE _POSIX_C_SOURCE=200809L)
target_compile_options(ballast_flags INTERFACE
  -Wall -Wextra -Wpedantic -Wconversion -Wshadow -Werror
  -Wstrict-prototypes -Wmissing-prototypes -Wvla -ffp-contract=off)

if(BALLAST_SANITIZE)
  target_compile_options(ballast_flags INTERFACE -fsanitize=${BALLAST_SANITIZE} -fno-omit-frame-pointer -fno-sanitize-recover=all)
  target_link_options(ballast_flags INTERFACE -fsanitize=${BALLAST_SANITIZE})
endif()
