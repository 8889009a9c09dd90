// The list of verbs, in the order of the help.
#include "src/verb.h"

namespace unsoldered {

void add_verbs(CLI::App& app, VerbAction& action) {
  for (const AddVerb add : {add_response_verb, add_knob_verb, add_render_verb, add_netlist_verb, add_catalogue_verb})
    add(app, action);
}

}  // namespace unsoldered
