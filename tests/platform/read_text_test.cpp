// SPDX-License-Identifier: GPL-3.0-or-later
#include "platform/read_text.h"

#include <doctest/doctest.h>

#include "quantity/failure.h"
#include "temporary_folder.h"

namespace kneeprint {

TEST_CASE("a file comes back byte for byte, whatever its length") {
  const testing::TemporaryFolder folder;
  const std::filesystem::path file = folder.path() / "file";
  for (const std::size_t length : {0, 1, 65535, 65536, 65537, 200000}) {
    std::string bytes(length, '\0');
    for (std::size_t i = 0; i < length; ++i) bytes[i] = static_cast<char>(i * 7 % 256);
    testing::write_bytes(file, bytes);
    CHECK((read_text(file) == bytes));
  }
}

TEST_CASE("a folder or a missing file is named with the reason") {
  const testing::TemporaryFolder folder;
  CHECK_THROWS_WITH_AS(read_text(folder.path()),
                       (folder.path().string() + ": cannot be read: Is a directory").c_str(),
                       InputError);
  const std::filesystem::path absent = folder.path() / "absent";
  CHECK_THROWS_WITH_AS(read_text(absent),
                       (absent.string() + ": cannot be read: No such file or directory").c_str(),
                       InputError);
}

}  // namespace kneeprint
