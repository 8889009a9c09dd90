// Catch2 for the tests, version 2 or 3: include this and nothing of Catch2's own.
//
// Write for version 3 with the namespaces spelled out, `Catch::Approx` and `Catch::Matchers::WithinAbs`; what
// version 2 names otherwise is named here the same way.
#pragma once

#if __has_include(<catch2/catch_all.hpp>)
#include <catch2/catch_all.hpp>
#else
#include <catch2/catch.hpp>

namespace Catch {

using Detail::Approx;

namespace Matchers {

inline StdString::ContainsMatcher ContainsSubstring(const std::string& text,
                                                    CaseSensitive::Choice choice = CaseSensitive::Yes) {
  return Contains(text, choice);
}

}  // namespace Matchers
}  // namespace Catch
#endif
