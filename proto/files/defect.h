// What is wrong with a file, one line each: file, field, what was found, what was expected.
#pragma once

#include <string>
#include <vector>

namespace pastern::files {

struct Defect {
  std::string file;
  std::string
      field;  ///< path in the file, e.g. "joints[3].drive.peak_torque_nm"; empty for the file as a whole
  std::string found;
  std::string expected;

  /// "hal_stub/robots/x.robot.txtpb: joints[3].axis: found length 0.5, expected a unit vector"
  [[nodiscard]] std::string line() const;
};

/// Empty means sound. Functions append and never remove.
using Defects = std::vector<Defect>;

/// All lines, each ended by a newline.
[[nodiscard]] std::string lines(const Defects& defects);

}  // namespace pastern::files
