#include "src/call_error.h"

#include <algorithm>
#include <string_view>
#include <vector>

#include "src/toml_block.h"
#include "src/toml_document.h"

namespace unsoldered {
namespace {

/// The verb that was given, or the program itself.
const CLI::App& chosen(const CLI::App& app) {
  const auto verbs = app.get_subcommands();
  return verbs.empty() ? app : *verbs.front();
}

/// "X is not a verb; was Y meant? Accepted are A, B, C".
std::string unknown(const std::string& word, const std::string& kind, const std::vector<std::string>& names) {
  const std::string_view near = nearest(word, {names.begin(), names.end()});
  std::string text =
      in_quotes(word) + " is not " + kind + (near.empty() ? "; a" : "; was " + in_quotes(near) + " meant? A");
  text += "ccepted are";
  for (const std::string& name : names) text += (&name == &names.front() ? " " : ", ") + name;
  return text;
}

std::string unknown_verb(const CLI::App& app, const std::string& word) {
  std::vector<std::string> verbs;
  for (const CLI::App* verb : app.get_subcommands([](const CLI::App*) { return true; }))
    verbs.push_back(verb->get_name());
  return unknown(word, "a verb", verbs);
}

std::string unknown_option(const CLI::App& verb, const std::string& word) {
  std::vector<std::string> options;
  for (const CLI::Option* option : verb.get_options()) {
    if (!option->get_positional()) options.push_back(option->get_name());
  }
  return unknown(word, "an option of " + (verb.get_parent() == nullptr ? "the program" : verb.get_name()), options);
}

/// Words left over: the first option among them is the likelier slip than its value.
std::string left_over(const CLI::App& app) {
  const CLI::App& verb = chosen(app);
  const std::vector<std::string> words = app.remaining(true);
  const auto option =
      std::find_if(words.begin(), words.end(), [](const std::string& word) { return word.starts_with('-'); });
  if (option != words.end()) return unknown_option(verb, *option);
  if (words.empty()) return "something was not understood";
  if (&verb == &app) return unknown_verb(app, words.front());
  return in_quotes(words.front()) +
         " is one name too many; an option such as --hookup or --set stands before each of its values";
}

/// The option that `error` names at its start, as in "--out is required".
const CLI::Option* named(const CLI::App& verb, std::string_view error) {
  for (const CLI::Option* option : verb.get_options()) {
    const std::string name = option->get_name();
    if (error.starts_with(name) &&
        (error.size() == name.size() || error[name.size()] == ' ' || error[name.size()] == ':')) {
      return option;
    }
  }
  return nullptr;
}

}  // namespace

std::string call_error_text(const CLI::App& app, const CLI::ParseError& error) {
  const CLI::App& verb = chosen(app);
  std::string what = error.what();
  const CLI::Option* option = named(verb, what);
  if (dynamic_cast<const CLI::ExtrasError*>(&error) != nullptr) {
    what = left_over(app);
  } else if (dynamic_cast<const CLI::RequiredError*>(&error) != nullptr && option != nullptr) {
    what = option->get_name() + " is missing; wanted is: " + option->get_description();
  } else if (dynamic_cast<const CLI::ArgumentMismatch*>(&error) != nullptr && option != nullptr) {
    what = option->get_name() + ": its value is missing; wanted is " + option->get_type_name() + ": " +
           option->get_description();
  }
  if (const auto end = what.find(" was given a disallowed flag override"); end != std::string::npos) {
    what = "--" + what.substr(0, end) + " takes no value; leave away the equals sign and what follows";
  }
  std::replace(what.begin(), what.end(), '\n', ' ');  // descriptions are broken into lines for the help
  return what + "; see unsoldered" + (&verb == &app ? "" : " " + verb.get_name()) + " --help";
}

}  // namespace unsoldered
