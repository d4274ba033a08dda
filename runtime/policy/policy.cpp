// What the cycle holds of a policy, in the scalar that its file names.
#include "runtime/policy/policy.h"

#include <cmath>

#include "runtime/policy/policy_parts.h"

namespace pastern::policy {

namespace {

template <class S>
BodyEstimate<S> converted(const BodyEstimate<>& body) noexcept {
  BodyEstimate<S> out;
  out.roll_rad = static_cast<S>(body.roll_rad);
  out.pitch_rad = static_cast<S>(body.pitch_rad);
  out.yaw_rad = static_cast<S>(body.yaw_rad);
  out.rate = {static_cast<S>(body.rate.x), static_cast<S>(body.rate.y), static_cast<S>(body.rate.z)};
  out.velocity = {static_cast<S>(body.velocity.x), static_cast<S>(body.velocity.y),
                  static_cast<S>(body.velocity.z)};
  out.position = {static_cast<S>(body.position.x), static_cast<S>(body.position.y),
                  static_cast<S>(body.position.z)};
  return out;
}

template <class S, class Unit, class From>
safety::PerJoint<Unit, S> converted(const safety::PerJoint<Unit, From>& values, int count) noexcept {
  safety::PerJoint<Unit, S> out;
  for (int j = 0; j < count; ++j) {
    out[j] = static_cast<S>(values[j]);
  }
  return out;
}

template <class S>
class PolicyIn final : public Policy {
 public:
  PolicyIn(const v1::Policy& policy, const v1::Robot& robot)
      : shape_(shape_of<S>(policy, robot)),
        scratch_(scratch_of(shape_)),
        parameters_(shape_.parameter_count, S(0)) {
    load(Parameters(policy.parameters().begin(), policy.parameters().end()));
  }

  [[nodiscard]] std::size_t parameter_count() const noexcept override { return parameters_.size(); }

  void load(const Parameters& parameters) noexcept override {
    const std::size_t count = std::min(parameters.size(), parameters_.size());
    for (std::size_t i = 0; i < count; ++i) {
      parameters_[i] = static_cast<S>(parameters[i]);
    }
  }

  void reset() noexcept override { phase_ = 0; }

  JointTarget<> step(const BodyEstimate<>& body, const JointAngles<>& angle, const JointSpeeds<>& speed,
                     double dt_s) noexcept override {
    const int count = shape_.joint_count;
    const JointTarget<S> target =
        evaluate(shape_, parameters_.data(), scratch_, converted<S>(body), converted<S>(angle, count),
                 converted<S>(speed, count), gait_phase(phase_));
    phase_ += shape_.gait_hz * dt_s;
    phase_ -= std::floor(phase_);
    return {converted<double>(target.angle, count), target.clipped};
  }

 private:
  Shape<S> shape_;
  Scratch<S> scratch_;
  std::vector<S> parameters_;
  double phase_{0};  // of the gait, in turns
};

}  // namespace

std::unique_ptr<Policy> Policy::make(const v1::Policy& policy, const v1::Robot& robot) {
  if (policy.scalar() == v1::Policy::FLOAT) {
    return std::make_unique<PolicyIn<float>>(policy, robot);
  }
  return std::make_unique<PolicyIn<double>>(policy, robot);
}

std::vector<Group> groups_of(const v1::Policy& policy) {
  std::vector<Group> groups;
  for (const v1::ParameterGroup& group : policy.groups()) {
    groups.push_back({group.name(), group.first(), group.count(), group.perturbation_scale()});
  }
  if (groups.empty()) {
    groups.push_back({"all", 0, static_cast<std::size_t>(policy.parameters_size()), kDefaultPerturbation});
  }
  return groups;
}

}  // namespace pastern::policy
