#include "outputs/line_board.hpp"

#include "outputs/shared_page.hpp"

namespace millpond {

LineBoard::LineBoard() : shared_(new_shared<Shared>()) {}

LineBoard::~LineBoard() {
    delete_shared(shared_);
}

} // namespace millpond
