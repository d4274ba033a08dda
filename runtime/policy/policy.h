// The deterministic feedforward policy: observation -> network -> action map -> joint targets, with its own
// gait clock. Two layers:
//  * Plain parts, templates over a scalar (observation, network, action map): policy_parts.h. Training and
//  lanes
//    of floats use the same source.
//  * Policy: what the cycle holds; float or double by file. No heap after make(); same inputs, same bits.
#pragma once

#include <memory>
#include <vector>

#include "pastern/v1/policy.pb.h"
#include "pastern/v1/robot.pb.h"
#include "runtime/types/body.h"
#include "runtime/types/parameters.h"

namespace pastern::policy {

class Policy {
 public:
  /// Both checked (proto/files/policy_file.h).
  [[nodiscard]] static std::unique_ptr<Policy> make(const v1::Policy& policy, const v1::Robot& robot);
  virtual ~Policy() = default;

  [[nodiscard]] virtual std::size_t parameter_count() const noexcept = 0;
  /// Between episodes only. The caller has checked size and finiteness. Copies; no heap.
  virtual void load(const Parameters& parameters) noexcept = 0;
  /// Phase to zero; the target becomes the stance.
  virtual void reset() noexcept = 0;
  /// One policy tick: `dt_s` is the policy's period; the phase advances by it afterwards. What is not finite
  /// in what it sees stays so in the target (the gate's business).
  virtual JointTarget<> step(const BodyEstimate<>& body, const JointAngles<>& angle,
                             const JointSpeeds<>& speed, double dt_s) noexcept = 0;
};

inline constexpr double kDefaultPerturbation = 0.05;

/// Perturbation groups of a policy; one group of all parameters with scale 0.05 when the file names none.
[[nodiscard]] std::vector<Group> groups_of(const v1::Policy& policy);

}  // namespace pastern::policy
