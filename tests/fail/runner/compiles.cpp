// expect: whatever
// runner: compiles, but must not
int main() { return 0; }
