#pragma once

#include <idas/idas.h>
#include <nvector/nvector_serial.h>
#include <sundials/sundials_config.h>
#include <sundials/sundials_context.h>
#include <sundials/sundials_linearsolver.h>
#include <sundials/sundials_matrix.h>

/// What differs between SUNDIALS 6.4 and 7: contexts without MPI, and where its messages go (ours
/// come from return codes; the library itself prints nothing).
namespace stillzone::core::sundials {

#if SUNDIALS_VERSION_MAJOR >= 7
inline int create_context(SUNContext* context) {
  const int code = SUNContext_Create(SUN_COMM_NULL, context);
  return code != 0 ? code : SUNContext_ClearErrHandlers(*context);
}
inline int silence(void* /*ida*/) { return 0; }
#else
inline int create_context(SUNContext* context) { return SUNContext_Create(nullptr, context); }
inline void no_message(int /*code*/, const char* /*module*/, const char* /*function*/,
                       char* /*message*/, void* /*data*/) {}
inline int silence(void* ida) { return IDASetErrHandlerFn(ida, no_message, nullptr); }
#endif

}  // namespace stillzone::core::sundials
