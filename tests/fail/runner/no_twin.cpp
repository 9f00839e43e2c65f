// expect: missing
// runner: there is no legal twin
int main() { return missing; }
