// Reads a scenario file and judges it against its robot.
#include "proto/files/scenario_file.h"

#include <cmath>
#include <set>

#include "proto/files/check.h"
#include "proto/files/drawn.h"
#include "proto/files/text.h"
#include "proto/files/words.h"

namespace pastern::files {
namespace {

class Judge {
 public:
  Judge(const v1::Scenario& scenario, const RobotFile& robot, const std::string& file, Defects& defects)
      : scenario_(scenario), robot_(robot), file_(file), defects_(defects) {}

  void run() {
    site();
    ground();
    wear();
    for (int i = 0; i < scenario_.faults_size(); ++i) fault(i);
  }

 private:
  void require(bool sound, const std::string& field, const std::string& found, const std::string& expected) {
    if (!sound) defects_.push_back({file_, field, found, expected});
  }

  void within(double value, double most, const std::string& field, const char* unit) {
    require(std::abs(value) <= most, field, shown_number(value),
            "between -" + shown_number(most) + " and " + shown_number(most) + " (" + unit + ")");
  }

  void site() {
    require(!scenario_.has_load_at_m() || scenario_.has_load_kg(), "load_at_m", "a place without a load",
            "load_kg beside it");
    require(!scenario_.has_load_hangs_m() || scenario_.load_kg() > 0, "load_hangs_m",
            shown_number(scenario_.load_hangs_m()), "a load_kg above 0 beside it");
    require(!scenario_.has_load_swing_damping() || scenario_.has_load_hangs_m(), "load_swing_damping",
            "a damping without a load that hangs", "load_hangs_m beside it");
    require(!scenario_.has_frames_late_s() || scenario_.has_frames_late(), "frames_late_s",
            "a lateness without frames_late", "frames_late beside it");
    require(!(scenario_.has_joint_damping_ratio() && scenario_.has_joint_damping_nm_s_per_rad()),
            "joint_damping_ratio", "joint_damping_nm_s_per_rad as well", "one of the two");
    require(scenario_.command_jitter_s() <= scenario_.command_delay_s(), "command_jitter_s",
            shown_number(scenario_.command_jitter_s()),
            "at most command_delay_s, " + shown_number(scenario_.command_delay_s()));
    within(scenario_.load_at_m().x(), 2, "load_at_m.x", "m");
    within(scenario_.load_at_m().y(), 2, "load_at_m.y", "m");
    within(scenario_.load_at_m().z(), 2, "load_at_m.z", "m");
    within(scenario_.imu_tilt_rad().x(), 0.5, "imu_tilt_rad.x", "rad");
    within(scenario_.imu_tilt_rad().y(), 0.5, "imu_tilt_rad.y", "rad");
    within(scenario_.imu_tilt_rad().z(), 0.5, "imu_tilt_rad.z", "rad");
  }

  // Height over length of a sine of slope 0.7. Steeper is no ground to walk on, and a foot's ball would
  // bridge the troughs.
  static constexpr double kSteepest = 0.22;

  void ground() {
    const double height = scenario_.ground_wave_height_m();
    const double length = scenario_.ground_wave_length_m();
    require(scenario_.has_ground_wave_height_m() == scenario_.has_ground_wave_length_m(),
            scenario_.has_ground_wave_height_m() ? "ground_wave_height_m" : "ground_wave_length_m",
            "one without the other", "ground_wave_height_m and ground_wave_length_m");
    if (length > 0) {
      require(height <= kSteepest * length, "ground_wave_height_m", shown_number(height),
              "at most " + shown_number(kSteepest) + " of the length " + shown_number(length) +
                  ", so that no wave is steeper than 0.7");
    }
    for (int i = 0; i < scenario_.ground_steps_size(); ++i) {
      const std::string at = "ground_steps[" + std::to_string(i) + "].height_m";
      require(scenario_.ground_steps(i).height_m() != 0, at, "0", "a height other than 0 (m)");
    }
    for (int i = 0; i < scenario_.ground_patches_size(); ++i) {
      const v1::GroundPatch& patch = scenario_.ground_patches(i);
      const std::string at = "ground_patches[" + std::to_string(i) + "]";
      require(patch.from_m() < patch.to_m(), at + ".to_m", shown_number(patch.to_m()),
              "more than from_m, " + shown_number(patch.from_m()));
      const bool sound = !patch.has_right_m() || !patch.has_left_m() || patch.right_m() < patch.left_m();
      require(sound, at + ".left_m", shown_number(patch.left_m()),
              "more than right_m, " + shown_number(patch.right_m()));
    }
  }

  void wear() {
    std::set<std::string> seen;
    for (int i = 0; i < scenario_.wear_size(); ++i) {
      const std::string at = "wear[" + std::to_string(i) + "].joint";
      const std::string& joint = scenario_.wear(i).joint();
      known(joint, at);
      require(seen.insert(joint).second, at, joint + ", said before", "each joint once");
    }
  }

  void known(const std::string& joint, const std::string& field) {
    require(robot_.joint_index(joint) >= 0, field, joint, "a joint of " + robot_.robot().name());
  }

  static bool of_a_joint(v1::Fault::Kind kind) {
    switch (kind) {
      case v1::Fault::ANGLE_STUCK:
      case v1::Fault::ANGLE_NAN:
      case v1::Fault::ANGLE_JUMP:
      case v1::Fault::SPEED_NAN:
      case v1::Fault::DRIVE_DEAD:
      case v1::Fault::DRIVE_RUNAWAY:
      case v1::Fault::WINDING_HOT:
      case v1::Fault::TORQUE_SENSE_HIGH:
        return true;
      default:
        return false;
    }
  }

  void fault(int index) {
    const v1::Fault& fault = scenario_.faults(index);
    const std::string at = "faults[" + std::to_string(index) + "].joint";
    if (of_a_joint(fault.kind())) {
      require(!fault.joint().empty(), at, "nothing", "the joint that fails");
      if (!fault.joint().empty()) known(fault.joint(), at);
    } else {
      require(fault.joint().empty(), at, fault.joint(),
              "nothing: " + v1::Fault::Kind_Name(fault.kind()) + " is no fault of a joint");
    }
  }

 public:
  /// Ranges: of numbers that there are, in order, said once, and sound wherever in them a site is drawn.
  void drawn() {
    std::set<std::string> seen;
    const std::size_t before = defects_.size();
    for (int i = 0; i < scenario_.drawn_size(); ++i) {
      const v1::Drawn& drawn = scenario_.drawn(i);
      const std::string at = "drawn[" + std::to_string(i) + "]";
      if (!is_number(drawn.field())) {
        require(false, at + ".field", drawn.field(), "a number of the scenario or of a joint's wear");
        continue;
      }
      require(drawn.low() <= drawn.high(), at + ".high", shown_number(drawn.high()),
              "at least low, " + shown_number(drawn.low()));
      drawn_joint(drawn, at);
      require(seen.insert(drawn.field() + " " + drawn.joint()).second, at + ".field",
              drawn.field() + ", drawn before", "each number once");
    }
    if (defects_.size() == before) corners();
  }

 private:
  void drawn_joint(const v1::Drawn& drawn, const std::string& at) {
    if (!is_wear(drawn.field())) {
      require(drawn.joint().empty(), at + ".joint", drawn.joint(),
              "nothing: " + drawn.field() + " is no joint's");
      require(!is_fixed(scenario_, drawn.field(), ""), at + ".field",
              drawn.field() + ", which has a value as well", "one of the two");
      return;
    }
    const bool any = drawn.joint() == kEachJoint || drawn.joint() == kOneJoint;
    require(any || robot_.joint_index(drawn.joint()) >= 0, at + ".joint",
            drawn.joint().empty() ? "nothing" : drawn.joint(),
            "each, one, or a joint of " + robot_.robot().name());
    require(any || !is_fixed(scenario_, drawn.field(), drawn.joint()), at + ".field",
            drawn.field() + " of " + drawn.joint() + ", which has a value as well", "one of the two");
  }

  /// Judges the sites at the ends of the ranges: every end of every number, and of those numbers that are
  /// judged against one another every combination.
  void corners() {
    static const std::set<std::string> kTogether = {
        "command_delay_s",      "command_jitter_s", "ground_wave_height_m",
        "ground_wave_length_m", "load_kg",          "load_hangs_m"};
    constexpr unsigned kCombinations = 64;
    Defects found;
    for (unsigned n = 0; n < kCombinations && found.empty(); ++n) {
      v1::Scenario site = scenario_;
      site.clear_drawn();
      unsigned together = 0;
      for (const v1::Drawn& drawn : scenario_.drawn()) {
        const bool high = kTogether.count(drawn.field()) > 0 ? (n >> together++ & 1U) != 0 : n % 2 != 0;
        const bool any = drawn.joint() == kEachJoint || drawn.joint() == kOneJoint;
        set_number(site, drawn.field(), any ? robot_.robot().joints(0).name() : drawn.joint(),
                   high ? drawn.high() : drawn.low());
      }
      check_rules(site, file_, "", found);
      Judge(site, robot_, file_, found).run();
    }
    for (Defect& defect : found) {
      defect.field = "drawn: " + defect.field;
      defects_.push_back(std::move(defect));
    }
  }

  const v1::Scenario& scenario_;
  const RobotFile& robot_;
  const std::string& file_;
  Defects& defects_;
};

}  // namespace

std::optional<v1::Scenario> parse_scenario(const std::string& text, const std::string& file,
                                           const RobotFile& robot, Defects& defects) {
  v1::Scenario scenario;
  if (!parse_text(text, file, scenario, defects)) return std::nullopt;
  const std::size_t before = defects.size();
  Judge(scenario, robot, file, defects).run();
  if (defects.size() == before) Judge(scenario, robot, file, defects).drawn();
  if (defects.size() != before) return std::nullopt;
  return scenario;
}

std::optional<v1::Scenario> read_scenario(const std::string& path, const RobotFile& robot, Defects& defects) {
  const std::optional<std::string> text = read_whole(path, defects);
  if (!text) return std::nullopt;
  return parse_scenario(*text, path, robot, defects);
}

}  // namespace pastern::files
