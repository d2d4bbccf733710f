/* A libmodbus server on loopback with the tables that the tests know. Prints its port; ends when its input ends. */
#include <errno.h>
#include <netinet/in.h>
#include <poll.h>
#include <stdio.h>
#include <sys/socket.h>
#include <unistd.h>
#include <modbus.h>

int main(void)
{
    modbus_t *ctx = modbus_new_tcp("127.0.0.1", 0);
    modbus_mapping_t *m = modbus_mapping_new(200, 200, 200, 200);
    uint8_t query[MODBUS_TCP_MAX_ADU_LENGTH];
    struct sockaddr_in at;
    socklen_t size = sizeof at;
    int listening, i;

    if (!ctx || !m)
        return 1;
    for (i = 0; i < 200; i++) {
        m->tab_bits[i] = i * i % 7 < 3;
        m->tab_input_bits[i] = i % 3 == 0;
        m->tab_registers[i] = (uint16_t)(i * 7919 + 13);
        m->tab_input_registers[i] = (uint16_t)(i * 104729 + 7);
    }
    m->tab_registers[20] = 0x47F1; /* 123456.0 as a float, high word first */
    m->tab_registers[21] = 0x2000;
    listening = modbus_tcp_listen(ctx, 1);
    if (listening < 0 || getsockname(listening, (struct sockaddr *)&at, &size) < 0)
        return 1;
    printf("%d\n", ntohs(at.sin_port));
    fflush(stdout);
    for (;;) {
        struct pollfd wait[2] = {{listening, POLLIN, 0}, {0, POLLIN, 0}};
        poll(wait, 2, -1);
        if (wait[1].revents)
            return 0;
        if (modbus_tcp_accept(ctx, &listening) < 0)
            return 1;
        for (;;) {
            int n = modbus_receive(ctx, query);
            if (n > 0)
                modbus_reply(ctx, query, n, m);
            else if (n < 0)
                break;
        }
    }
}
