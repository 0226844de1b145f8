// Prints every settings key as a Markdown table: what tools/update-readme puts into README.md.
#include "settings/settings.hpp"

#include <cstdio>

int main() {
    std::fputs(millpond::settings_reference().c_str(), stdout);
    return 0;
}
