// Constant figures of a robot in a narrower kind of number.
#pragma once

#include "hal_stub/robot/robot_state.h"

namespace pastern::packed {

template <class C>
stub::Vec3<C> narrowed(const stub::Vec3<double>& a) {
  return {C(a.x), C(a.y), C(a.z)};
}

template <class C>
stub::LinkFigures<C> narrowed(const stub::LinkFigures<double>& a) {
  stub::LinkFigures<C> made;
  made.mass = C(a.mass);
  made.centre = narrowed<C>(a.centre);
  made.inertia = {C(a.inertia.xx), C(a.inertia.yy), C(a.inertia.zz),
                  C(a.inertia.xy), C(a.inertia.xz), C(a.inertia.yz)};
  made.skewed = a.skewed;
  return made;
}

template <class C>
stub::JointFigures<C> narrowed(const stub::JointFigures<double>& a) {
  stub::JointFigures<C> made;
  made.sign = C(a.sign);
  made.axis = narrowed<C>(a.axis);
  made.origin = narrowed<C>(a.origin);
  made.angle_min = C(a.angle_min);
  made.angle_max = C(a.angle_max);
  made.link = narrowed<C>(a.link);
  made.kind = a.kind;
  made.order = a.order;
  made.slides = a.slides;
  made.parent = a.parent;
  made.line = a.line;
  return made;
}

template <class C>
stub::PointFigures<C> narrowed(const stub::PointFigures<double>& a) {
  return {narrowed<C>(a.at), C(a.radius), a.joint, a.foot};
}

template <class C>
stub::DriveFigures<C> narrowed(const stub::DriveFigures<double>& a) {
  return {C(a.peak_torque),   C(a.no_load_speed), C(a.rotor_inertia), C(a.per_amp), C(a.resistance),
          C(a.winding_per_j), C(a.housing_per_j), C(a.to_housing),    C(a.to_air),  C(a.timeout_damping),
          C(a.most_torque),   C(a.hot),           C(a.per_derating)};
}

template <class C>
stub::Tree<C> narrowed(const stub::Tree<double>& a) {
  stub::Tree<C> made;
  made.joint_count = a.joint_count;
  made.leg_count = a.leg_count;
  for (std::size_t l = 0; l < a.leg.size(); ++l) {
    auto& leg = made.leg[l];
    for (std::size_t i = 0; i < leg.joint.size(); ++i) leg.joint[i] = narrowed<C>(a.leg[l].joint[i]);
    leg.foot = narrowed<C>(a.leg[l].foot);
    leg.foot_radius = C(a.leg[l].foot_radius);
    leg.knee_radius = C(a.leg[l].knee_radius);
    leg.joint_count = a.leg[l].joint_count;
    leg.knee = a.leg[l].knee;
    leg.stands = a.leg[l].stands;
    leg.general = a.leg[l].general;
    leg.point_count = a.leg[l].point_count;
    for (std::size_t p = 0; p < leg.point.size(); ++p) leg.point[p] = narrowed<C>(a.leg[l].point[p]);
  }
  made.trunk = narrowed<C>(a.trunk);
  for (std::size_t c = 0; c < a.corner.size(); ++c) made.corner[c] = narrowed<C>(a.corner[c]);
  made.half_size = narrowed<C>(a.half_size);
  made.gravity = C(a.gravity);
  made.stop_stiffness = C(a.stop_stiffness);
  made.stop_damping = C(a.stop_damping);
  made.slide_stiffness = C(a.slide_stiffness);
  made.slide_damping = C(a.slide_damping);
  return made;
}

template <class C>
stub::Figures<C> narrowed(const stub::Figures<double>& a) {
  stub::Figures<C> made;
  made.tree = narrowed<C>(a.tree);
  for (std::size_t j = 0; j < a.drive.size(); ++j) made.drive[j] = narrowed<C>(a.drive[j]);
  for (std::size_t i = 0; i < a.teeth.size(); ++i) {
    made.teeth[i] = {C(a.teeth[i].stiffness), C(a.teeth[i].damping)};
  }
  made.pack = {C(a.pack.nominal), C(a.pack.capacity_as), C(a.pack.resistance), C(a.pack.idle),
               C(a.pack.most_current)};
  return made;
}

}  // namespace pastern::packed
