// The microcontroller's end of `kind: serial_bytes`, for any board that has the Arduino functions. What each byte means
// stands in src/outputs/serial_bytes_output.hpp. The line falls by itself when it was high for LONGEST_HIGH_MS, or when
// nothing was heard for SILENCE_MS, whatever the computer does.
const int LINE = 8;                        // the pin that is the line
const unsigned long LONGEST_HIGH_MS = 100; // set it for your stimulator; settings' width_ms must be less
const unsigned long SILENCE_MS = 1000;

unsigned long rose_at = 0, heard_at = 0;
bool is_high = false;

void set_line(bool high) {
    if (high && !is_high) {
        rose_at = millis(); // more orders to rise do not make it longer
    }
    is_high = high;
    digitalWrite(LINE, high ? HIGH : LOW);
}

void setup() {
    pinMode(LINE, OUTPUT);
    set_line(false);
    Serial.begin(115200);
}

void loop() {
    if (Serial.available() > 0) {
        heard_at = millis();
        switch (Serial.read()) {
        case 'H': set_line(true); break;
        case 'L': set_line(false); break;
        case 'K': Serial.write('k'); break;
        case '?': Serial.print("millpond line 1 "); Serial.println(LONGEST_HIGH_MS); break;
        }
    }
    if (is_high && (millis() - rose_at >= LONGEST_HIGH_MS || millis() - heard_at >= SILENCE_MS)) {
        set_line(false);
    }
}
