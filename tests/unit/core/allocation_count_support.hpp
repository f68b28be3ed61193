#pragma once

namespace stillzone::test {

/// How often operator new was called in this test program so far.
[[nodiscard]] long allocation_count();

}  // namespace stillzone::test
