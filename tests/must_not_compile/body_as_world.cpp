// A vector in the body frame is not one in the world frame.
#include "runtime/types/body.h"
#include "safety/frames.h"

void place(pastern::BodyEstimate<>& body, const pastern::safety::SensorFrame& frame) {
  const pastern::safety::Vector3<pastern::safety::Metre, pastern::safety::Body> foot{0, 0, -0.3};
  (void)foot;
#ifdef OFFENDING
  body.position = foot;
#else
  body.position = frame.position;
#endif
}
