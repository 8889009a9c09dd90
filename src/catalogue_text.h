// The text of assets/catalogue.toml, compiled in so that the program needs no file beside it.
#pragma once

namespace unsoldered {

extern const char* const kCatalogueText;

}  // namespace unsoldered
